using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Study;

namespace PanelChoice.Data;

/// <summary>A column that the study needs, and who asks for it.</summary>
/// <param name="Name">Name of the column.</param>
/// <param name="AskedBy">The key or term of the study file that names it first, for messages.</param>
internal sealed record NeededColumn(string Name, string AskedBy);

/// <summary>The columns that a study needs of its data file; all others are never looked at.</summary>
/// <param name="All">Every needed name once, in the order in which the study names them.</param>
/// <param name="Numbers">Those that terms read as numbers.</param>
/// <param name="Texts">Those read as text: <c>is</c>, <c>levels</c>, and the columns of clusters.</param>
internal sealed record NeededColumns(ImmutableArray<NeededColumn> All, ImmutableArray<string> Numbers, ImmutableArray<string> Texts)
{
    /// <summary>Gathers what a study needs. A column named both as number and as text is needed both ways.</summary>
    public static NeededColumns Of(StudySpecification study)
    {
        var all = new List<NeededColumn>();
        var numbers = new List<string>();
        var texts = new List<string>();
        var panel = study.Panel;
        Key(panel.Person, "person");
        Key(panel.Occasion, "occasion");
        Key(panel.Alternative, "alternative");
        Key(panel.Chosen, "chosen");
        Key(panel.Offered, "offered");
        Key(panel.Weight, "weight");
        foreach (var term in study.Terms)
        {
            var asker = string.Create(CultureInfo.InvariantCulture, $"term '{term.Name}' (line {term.Line} of {study.File})");
            if (term.Source is ColumnSource source) Add(source.Column, asker, source.Is is not null || source.Levels ? texts : numbers);
            if (term.Times is { } times) Add(times, asker, numbers);
        }

        if (study.Inference.Cluster != "person") Add(study.Inference.Cluster, "[inference] cluster", texts);
        if (SecondGrouping.Of(study) is { Column: { } second }) Add(second, "[inference] second_cluster", texts);
        return new NeededColumns([.. all], [.. numbers], [.. texts]);

        void Key(string? name, string key)
        {
            if (name is not null) Add(name, $"[panel] {key}", null);
        }

        void Add(string name, string asker, List<string>? reading)
        {
            if (!all.Exists(c => c.Name == name)) all.Add(new NeededColumn(name, asker));
            if (reading is not null && !reading.Contains(name)) reading.Add(name);
        }
    }

    /// <summary>Where each needed column stands among the file's names; what is missing or stands there twice goes to the problems.</summary>
    /// <param name="file">The data file as the study writes it.</param>
    /// <param name="names">The file's column names, blanks around them removed.</param>
    /// <param name="problems">Takes one problem for each column that cannot be located.</param>
    public ImmutableDictionary<string, int> Locate(string file, IReadOnlyList<string> names, ProblemList problems)
    {
        var places = ImmutableDictionary.CreateBuilder<string, int>(StringComparer.Ordinal);
        foreach (var column in All)
        {
            var found = Enumerable.Range(0, names.Count).Where(i => names[i] == column.Name).ToList();
            if (found.Count == 1)
                places[column.Name] = found[0];
            else if (found.Count > 1)
                problems.Add(new Problem(
                    "data.duplicate_column", file,
                    string.Create(CultureInfo.InvariantCulture, $"{found.Count} columns have this name, which {column.AskedBy} asks for"),
                    "give each column its own name") { Column = column.Name });
            else
                problems.Add(new Problem(
                    "data.missing_column", file, $"there is no such column, but {column.AskedBy} asks for it",
                    ClosestName.Remedy(column.Name, [.. names.Where(n => n.Length > 0)])) { Column = column.Name });
        }

        return places.ToImmutable();
    }
}
