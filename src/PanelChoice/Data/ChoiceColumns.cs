using System.Collections.Immutable;
using System.Runtime.InteropServices;
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
    private readonly ColumnBuffer<long> sourceRow = new();
    private readonly CellColumn[] besidesPerson;

    /// <summary>The columns of a study's table.</summary>
    /// <param name="study">The study.</param>
    /// <param name="outline">What a first reading found, when the file is read again; null at the first.</param>
    public ChoiceColumns(StudySpecification study, TableOutline? outline = null)
    {
        this.study = study;
        Needed = NeededColumns.Of(study);
        var panel = study.Panel;
        var readings = new List<ColumnReading>();
        // The offered column comes first, because it decides which cells of its row may be empty.
        offered = panel.Offered is { } o ? Reading(o, new FlagColumn(panel.File, o, otherwise: true)) : null;
        person = Reading(panel.Person, new TextColumn(panel.File, panel.Person, isKey: true, outline?.Persons ?? []));
        occasion = panel.Occasion is { } when ? Reading(when, new OccasionColumn(panel.File, when, outline?.OccasionKind ?? OccasionKind.None)) : null;
        alternative = Reading(panel.Alternative, new TextColumn(panel.File, panel.Alternative, isKey: true, outline?.Alternatives ?? []));
        chosen = Reading(panel.Chosen, new FlagColumn(panel.File, panel.Chosen, otherwise: false));
        weight = panel.Weight is { } w ? Reading(w, new NumberColumn(panel.File, w)) : null;
        foreach (var name in Needed.Numbers) numbers.Add(Reading(name, new NumberColumn(panel.File, name)));
        foreach (var name in Needed.Texts) texts.Add(Reading(name, new TextColumn(panel.File, name, isKey: false, outline?.Texts[name] ?? [])));
        Readings = [.. readings];
        besidesPerson = [.. readings.Select(r => r.Into).Where(c => c != person)];
        StoredBytes = sizeof(int) + sizeof(long) + besidesPerson.Sum(c => c.StoredBytes);

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

    /// <summary>Called where rows are complete in every column, so that they may be handed over or forgotten.</summary>
    public Action? RowsAdded { get; set; }

    /// <summary>Number of rows begun and still held.</summary>
    public int Rows => sourceRow.Count;

    /// <summary>Person of each row held, coded in the order in which persons first came up.</summary>
    public ReadOnlySpan<int> PersonCodes => person.Codes;

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

    /// <summary>Makes room for more rows.</summary>
    public void Reserve(int more)
    {
        sourceRow.Reserve(more);
        foreach (var reading in Readings) reading.Into.Reserve(more);
    }

    /// <summary>Bytes of a row that <see cref="Store"/> writes.</summary>
    public int StoredBytes { get; }

    /// <summary>Writes a row held: the person's code first, by which <see cref="PersonOf"/> tells rows apart.</summary>
    public void Store(int index, Span<byte> to)
    {
        MemoryMarshal.Write(to, person.Codes[index]);
        MemoryMarshal.Write(to[sizeof(int)..], sourceRow[index]);
        to = to[(sizeof(int) + sizeof(long))..];
        foreach (var column in besidesPerson)
        {
            column.Store(index, to);
            to = to[column.StoredBytes..];
        }
    }

    /// <summary>Person's code in a row that <see cref="Store"/> wrote.</summary>
    public static int PersonOf(ReadOnlySpan<byte> row) => MemoryMarshal.Read<int>(row);

    /// <summary>Adds a row that <see cref="Store"/> wrote.</summary>
    public void Restore(ReadOnlySpan<byte> from)
    {
        person.Restore(from);
        sourceRow.Add(MemoryMarshal.Read<long>(from[sizeof(int)..]));
        from = from[(sizeof(int) + sizeof(long))..];
        foreach (var column in besidesPerson)
        {
            column.Restore(from);
            from = from[column.StoredBytes..];
        }
    }

    /// <summary>Drops all rows held; what was wrong with them stays noted.</summary>
    public void Forget()
    {
        var rows = Rows;
        foreach (var reading in Readings) reading.Into.Forget(rows);
        sourceRow.Forget(rows);
    }

    /// <summary>Everything wrong so far; empty where the file can be used.</summary>
    /// <param name="rows">Number of rows read, held or not.</param>
    public ImmutableArray<Problem> AllProblems(long rows)
    {
        ProblemList[] lists = [Problems, .. Readings.Select(r => r.Into.Problems)];
        if (!Array.TrueForAll(lists, list => list.IsEmpty)) return ProblemList.InRowOrder(lists);
        return rows > 0 ? [] : [new Problem("data.no_rows", study.Panel.File, "there are no rows below the column names", "give the panel's rows")];
    }

    /// <summary>The table, or all problems.</summary>
    /// <param name="sha256">Hash of the file's bytes.</param>
    public Checked<ChoiceTable> Finish(string sha256)
    {
        var wrong = AllProblems(Rows);
        return wrong.IsEmpty
            ? Checked<ChoiceTable>.Good(Take(Rows, sha256, person.Finish(), alternative.Finish(), texts.ToImmutableDictionary(t => t.Name, t => t.Finish(), StringComparer.Ordinal)))
            : Checked<ChoiceTable>.Bad(wrong);
    }

    /// <summary>What the first reading found out about the file as a whole.</summary>
    /// <param name="sha256">Hash of the file's bytes.</param>
    /// <param name="rows">Number of rows read.</param>
    public TableOutline Outline(string sha256, long rows) => new(
        study.Panel.File, sha256, rows, occasion?.Kind ?? OccasionKind.None, Ordered(person, NameOrder.Of), Ordered(alternative, null),
        texts.ToImmutableDictionary(t => t.Name, t => Ordered(t, null), StringComparer.Ordinal));

    /// <summary>Names of persons in the order in which they first came up.</summary>
    public ImmutableArray<string> PersonsAsTheyCame() => person.Names();

    /// <summary>
    /// Hands over the first rows, which hold whole persons in the panel's order, as a table of these persons alone; other columns keep the codes of the
    /// whole file. Null where the file shows something that the first reading did not see.
    /// </summary>
    /// <param name="rows">Number of rows.</param>
    /// <param name="outline">What the first reading found.</param>
    public ChoiceTable? TakePersons(int rows, TableOutline outline)
    {
        if (!IsAsIn(outline)) return null;
        var codes = person.Take(rows);
        var (first, last) = (codes[0], codes[^1]);
        return Take(
            rows, outline.Sha256,
            new CodedColumn([.. codes.Select(c => c - first)], outline.Persons[first..(last + 1)]),
            new CodedColumn(alternative.Take(rows), outline.Alternatives),
            texts.ToImmutableDictionary(t => t.Name, t => new CodedColumn(t.Take(rows), outline.Texts[t.Name]), StringComparer.Ordinal));
    }

    /// <summary>Whether rows read again, so far, show nothing that the first reading did not see.</summary>
    public bool IsAsIn(TableOutline outline) =>
        !person.HasUnknown && !alternative.HasUnknown && !texts.Exists(t => t.HasUnknown) && (occasion?.Kind ?? OccasionKind.None) == outline.OccasionKind
        && AllProblems(outline.Rows).IsEmpty;

    private static ImmutableArray<string> Ordered(TextColumn column, Func<ImmutableArray<string>, int[]>? order)
    {
        var values = column.Names();
        return order is null ? values.Sort(StringComparer.Ordinal) : [.. order(values).Select(i => values[i])];
    }

    private ChoiceTable Take(int rows, string sha256, CodedColumn persons, CodedColumn alternatives, ImmutableDictionary<string, CodedColumn> textsTaken) => new(
        study.Panel.File,
        sha256,
        sourceRow.Take(rows),
        persons,
        occasion?.Kind ?? OccasionKind.None,
        occasion?.Take(rows) ?? [.. new long[rows]],
        alternatives,
        chosen.Take(rows),
        offered?.Take(rows) ?? [.. Enumerable.Repeat(true, rows)],
        weight?.Take(rows) ?? [],
        numbers.ToImmutableDictionary(n => n.Name, n => n.Take(rows), StringComparer.Ordinal),
        textsTaken);
}
