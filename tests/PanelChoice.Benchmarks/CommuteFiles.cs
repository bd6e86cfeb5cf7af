using System.Collections.Immutable;
using System.Globalization;
using System.Text;
using Parquet;
using Parquet.Schema;
using PanelChoice.Covariates;

namespace PanelChoice.Benchmarks;

/// <summary>
/// Writes a case as an analyst would hold it: a long table of trips and a study file that makes the case's covariates from it. Past choices
/// are not in the table; the study asks for them.
/// </summary>
/// <param name="made">The case.</param>
/// <param name="isByOccasion">Whether rows stand day by day, all persons of a day together; otherwise person by person.</param>
internal sealed class CommuteFiles(CommuteCase made, bool isByOccasion = false)
{
    private const int RowsOfGroup = 1 << 18;

    private readonly int J = made.Shape.Alternatives;

    private int Rows => made.Shape.Situations * J;

    private ImmutableArray<string> Modes => made.Market.Tree.Alternatives;

    /// <summary>Columns of attributes and the covariate each is written from.</summary>
    private IEnumerable<(string Name, Covariate From)> Attributes => made.Covariates.Covariates
        .Where(c => c.Term is "time" or "cost" or "wait" || c.Term.StartsWith("single", StringComparison.Ordinal))
        .Select(c => (ColumnOf(c.Term), c));

    /// <summary>Writes the table as Parquet, compressed by snappy.</summary>
    public void WriteParquet(string path) => WriteParquetAsync(path).GetAwaiter().GetResult();

    /// <summary>Writes the table as comma-separated text.</summary>
    public void WriteCsv(string path)
    {
        var attributes = Attributes.ToArray();
        using var file = new StreamWriter(path, append: false, new UTF8Encoding(false), 1 << 16) { NewLine = "\n" };
        file.WriteLine($"person,occasion,mode,offered,taken,{string.Join(',', attributes.Select(a => a.Name))}");
        var line = new StringBuilder();
        for (var at = 0; at < Rows; at++)
        {
            var row = RowAt(at);
            line.Clear().Append(CultureInfo.InvariantCulture, $"{Person(row)},{Occasion(row)},{Modes[row % J]},{(IsOffered(row) ? 1 : 0)},{(IsTaken(row) ? 1 : 0)}");
            foreach (var (_, from) in attributes) line.Append(CultureInfo.InvariantCulture, $",{Value(from, row)}");
            file.WriteLine(line);
        }
    }

    /// <summary>Writes a study about a table in the same folder.</summary>
    /// <param name="path">The study file.</param>
    /// <param name="table">Name of the table's file.</param>
    /// <param name="replicates">Bootstrap replicates.</param>
    public void WriteStudy(string path, string table, int replicates)
    {
        var text = new StringBuilder();
        text.Append(CultureInfo.InvariantCulture, $"""
            title = "Commute panel {made.Shape.Name}"

            [panel]
            file = "{table}"
            person = "person"
            occasion = "occasion"
            alternative = "mode"
            offered = "offered"
            chosen = "taken"
            shared_calendar = false

            [history]
            previous = "step"
            without_history = "zero"


            """);
        foreach (var nest in made.Market.Nests) Table("nest", $"name = \"{nest.Name}\"", $"members = [{Quoted(nest.Members)}]");
        Table("term", "name = \"constant\"", "constant = true", "each = true", $"base = \"{CommuteMarket.BaseName}\"");
        foreach (var covariate in made.Covariates.Covariates.Where(c => !c.IsConstant))
        {
            var source = covariate.Term switch
            {
                "same as last time" => "last_choice = 1",
                "habit" => string.Create(CultureInfo.InvariantCulture, $"stock = {CommuteDraws.Retention}"),
                _ => $"column = \"{ColumnOf(covariate.Term)}\"",
            };
            string[] some = covariate.Enters.Length == J ? [] : [$"alternatives = [{Quoted(covariate.Enters.Select(j => Modes[j]))}]"];
            Table("term", [$"name = \"{covariate.Term}\"", source, .. some]);
        }

        text.Append(CultureInfo.InvariantCulture, $"""
            [inference.bootstrap]
            replicates = {replicates}

            """);
        File.WriteAllText(path, text.ToString());

        void Table(string name, params string[] lines) => text.Append(CultureInfo.InvariantCulture, $"[[{name}]]\n{string.Join('\n', lines)}\n\n");
    }

    private static string Quoted(IEnumerable<string> names) => string.Join(", ", names.Select(n => $"\"{n}\""));

    private static string ColumnOf(string term) => term.Replace(' ', '_');

    /// <summary>Row of the case that stands at a place of the table.</summary>
    private int RowAt(int place)
    {
        if (!isByOccasion) return place;
        var (situation, alternative) = (place / J, place % J);
        return ((((situation % made.Shape.Persons) * made.Shape.Occasions) + (situation / made.Shape.Persons)) * J) + alternative;
    }

    private int Person(int row) => (row / (J * made.Shape.Occasions)) + 1;

    private int Occasion(int row) => (row / J % made.Shape.Occasions) + 1;

    private bool IsOffered(int row) => made.Covariates.Panel.Offered[row];

    private bool IsTaken(int row) => made.Covariates.Panel.Chosen[row / J] == row % J;

    private double Value(Covariate from, int row)
    {
        var place = from.Enters.Length == J ? row % J : from.Enters.IndexOf(row % J);
        return place < 0 ? 0 : from.Values[(row / J * from.Enters.Length) + place];
    }

    private async Task WriteParquetAsync(string path)
    {
        DataField[] keys = [new DataField<int>("person"), new DataField<int>("occasion"), new DataField<string>("mode", nullable: false), new DataField<bool>("offered"), new DataField<bool>("taken")];
        var attributes = Attributes.Select(a => (Field: new DataField<double>(a.Name), a.From)).ToArray();
        var options = new ParquetOptions { CompressionMethod = CompressionMethod.Snappy };
        var file = File.Create(path);
        await using (file.ConfigureAwait(false))
        {
            var writer = await ParquetWriter.CreateAsync(new ParquetSchema([.. keys, .. attributes.Select(a => a.Field)]), file, options).ConfigureAwait(false);
            await using (writer.ConfigureAwait(false))
            {
                for (var first = 0; first < Rows; first += RowsOfGroup)
                {
                    var start = first;
                    T[] Cells<T>(Func<int, T> value) => [.. Enumerable.Range(start, Math.Min(RowsOfGroup, Rows - start)).Select(at => value(RowAt(at)))];
                    using var group = writer.CreateRowGroup();
                    await group.WriteAsync<int>(keys[0], Cells(Person)).ConfigureAwait(false);
                    await group.WriteAsync<int>(keys[1], Cells(Occasion)).ConfigureAwait(false);
                    await group.WriteAsync(keys[2], Cells(row => Modes[row % J])).ConfigureAwait(false);
                    await group.WriteAsync<bool>(keys[3], Cells(IsOffered)).ConfigureAwait(false);
                    await group.WriteAsync<bool>(keys[4], Cells(IsTaken)).ConfigureAwait(false);
                    foreach (var (field, from) in attributes) await group.WriteAsync<double>(field, Cells(row => Value(from, row))).ConfigureAwait(false);
                }
            }
        }
    }
}
