using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Data;

/// <summary>A way in which a column of the file is read; a column may be read in several ways.</summary>
/// <param name="Source">Name of the column in the file.</param>
/// <param name="Into">What takes its cells.</param>
internal sealed record ColumnReading(string Source, CellColumn Into);

/// <summary>All columns of a table while its file is read, whatever the file's format.</summary>
internal sealed class ChoiceColumns
{
    private readonly StudySpecification study;
    private readonly TextColumn person;
    private readonly TextColumn alternative;
    private readonly OccasionColumn? occasion;
    private readonly FlagColumn chosen;
    private readonly FlagColumn? offered;
    private readonly NumberColumn? weight;
    private readonly List<NumberColumn> numbers = [];
    private readonly List<TextColumn> texts = [];
    private readonly ImmutableArray<long>.Builder sourceRow = ImmutableArray.CreateBuilder<long>();

    public ChoiceColumns(StudySpecification study)
    {
        this.study = study;
        Needed = NeededColumns.Of(study);
        var panel = study.Panel;
        var readings = new List<ColumnReading>();
        // The offered column comes first, because it decides which cells of its row may be empty.
        offered = panel.Offered is { } o ? Reading(o, new FlagColumn(panel.File, o, otherwise: true)) : null;
        person = Reading(panel.Person, new TextColumn(panel.File, panel.Person, isKey: true));
        occasion = panel.Occasion is { } when ? Reading(when, new OccasionColumn(panel.File, when)) : null;
        alternative = Reading(panel.Alternative, new TextColumn(panel.File, panel.Alternative, isKey: true));
        chosen = Reading(panel.Chosen, new FlagColumn(panel.File, panel.Chosen, otherwise: false));
        weight = panel.Weight is { } w ? Reading(w, new NumberColumn(panel.File, w)) : null;
        foreach (var name in Needed.Numbers) numbers.Add(Reading(name, new NumberColumn(panel.File, name)));
        foreach (var name in Needed.Texts) texts.Add(Reading(name, new TextColumn(panel.File, name, isKey: false)));
        Readings = [.. readings];

        T Reading<T>(string source, T into)
            where T : CellColumn
        {
            readings.Add(new ColumnReading(source, into));
            return into;
        }
    }

    /// <summary>The columns of the file that are read.</summary>
    public NeededColumns Needed { get; }

    /// <summary>Every way in which a column is read; where there is an offered column, it is the first.</summary>
    public ImmutableArray<ColumnReading> Readings { get; }

    /// <summary>What is wrong with the file as a whole, or with a row as a whole.</summary>
    public ProblemList Problems { get; } = new();

    /// <summary>Number of rows begun.</summary>
    public int Rows => sourceRow.Count;

    /// <summary>Begins a row.</summary>
    public void BeginRow(long row) => sourceRow.Add(row);

    /// <summary>Where a cell stands, once the row's cell in the offered column has been added (if there is such a column).</summary>
    /// <param name="index">Index of the row among those begun.</param>
    public CellPlace PlaceOf(int index) => new(sourceRow[index], offered is null || offered.Count <= index || offered[index]);

    /// <summary>Where the cells of the rows from an index on stand, as <see cref="PlaceOf"/> tells it.</summary>
    public CellPlace[] PlacesFrom(int index)
    {
        var places = new CellPlace[Rows - index];
        for (var i = 0; i < places.Length; i++) places[i] = PlaceOf(index + i);
        return places;
    }

    /// <summary>The table, or all problems.</summary>
    /// <param name="sha256">Hash of the file's bytes.</param>
    public Checked<ChoiceTable> Finish(string sha256)
    {
        ProblemList[] lists = [Problems, .. Readings.Select(r => r.Into.Problems)];
        if (!Array.TrueForAll(lists, list => list.IsEmpty)) return Checked<ChoiceTable>.Bad(ProblemList.InRowOrder(lists));
        if (Rows == 0)
            return Checked<ChoiceTable>.Bad([new Problem("data.no_rows", study.Panel.File, "there are no rows below the column names", "give the panel's rows")]);
        var rows = Rows;
        return Checked<ChoiceTable>.Good(new ChoiceTable(
            study.Panel.File,
            sha256,
            sourceRow.DrainToImmutable(),
            person.Finish(),
            occasion?.Kind ?? OccasionKind.None,
            occasion?.Finish() ?? [.. new long[rows]],
            alternative.Finish(),
            chosen.Finish(),
            offered?.Finish() ?? [.. Enumerable.Repeat(true, rows)],
            weight?.Finish() ?? [],
            numbers.ToImmutableDictionary(n => n.Name, n => n.Finish(), StringComparer.Ordinal),
            texts.ToImmutableDictionary(t => t.Name, t => t.Finish(), StringComparer.Ordinal)));
    }
}
