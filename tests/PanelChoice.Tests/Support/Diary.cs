using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Data;
using PanelChoice.Panels;

namespace PanelChoice.Tests.Support;

/// <summary>
/// Small panels written out by hand, one line for each occasion: <c>person occasion choice key=value,value,...</c> with one value for each
/// alternative in the order named. <c>offered=ferry,tram</c> names the alternatives that were available (default: all that have a row),
/// <c>rows=ferry,tram</c> those that have a row (default: all); a value <c>-</c> is an empty cell. Lines may stand in any order.
/// </summary>
internal static class Diary
{
    /// <summary>The panel of a diary.</summary>
    /// <param name="alternatives">Names of the alternatives, separated by blanks.</param>
    /// <param name="lines">The lines, separated by line ends.</param>
    public static ChoicePanel Panel(string alternatives, string lines) => PanelOf(Table(alternatives, lines));

    /// <summary>The long table of a diary.</summary>
    public static ChoiceTable Table(string alternatives, string lines)
    {
        var names = alternatives.Split(' ');
        var rows = new List<(string Person, string Occasion, string Alternative, bool Chosen, bool Offered, Dictionary<string, string> Cells)>();
        foreach (var line in lines.Split('\n', StringSplitOptions.RemoveEmptyEntries | StringSplitOptions.TrimEntries))
        {
            var words = line.Split(' ', StringSplitOptions.RemoveEmptyEntries);
            var keys = words.Skip(3).Select(w => w.Split('=')).ToDictionary(w => w[0], w => w[1].Split(','));
            var present = keys.GetValueOrDefault("rows", names);
            var offered = keys.GetValueOrDefault("offered", present);
            for (var j = 0; j < names.Length; j++)
            {
                if (!present.Contains(names[j])) continue;
                var at = j;
                rows.Add((words[0], words[1], names[j], words[2] == names[j], offered.Contains(names[j]),
                    keys.Where(k => k.Key is not ("rows" or "offered")).ToDictionary(k => k.Key, k => k.Value.Length == 1 ? k.Value[0] : k.Value[at])));
            }
        }

        var columns = rows.SelectMany(r => r.Cells.Keys).Distinct().ToList();
        string Cell(int row, string column) => rows[row].Cells.GetValueOrDefault(column, "-");
        bool IsNumber(string column) => Enumerable.Range(0, rows.Count).All(r =>
            Cell(r, column) == "-" || double.TryParse(Cell(r, column), NumberStyles.Float, CultureInfo.InvariantCulture, out _));
        var isDate = rows.TrueForAll(r => DateOnly.TryParseExact(r.Occasion, "yyyy-MM-dd", CultureInfo.InvariantCulture, DateTimeStyles.None, out _));
        return new ChoiceTable(
            "diary.csv", new string('0', 64),
            [.. Enumerable.Range(0, rows.Count).Select(i => (long)i + 2)],
            Coded(rows.Select(r => r.Person)),
            isDate ? OccasionKind.Date : OccasionKind.WholeNumber,
            [.. rows.Select(r => isDate ? Day(r.Occasion) : long.Parse(r.Occasion, CultureInfo.InvariantCulture))],
            Coded(rows.Select(r => r.Alternative)),
            [.. rows.Select(r => r.Chosen)],
            [.. rows.Select(r => r.Offered)],
            [],
            columns.Where(IsNumber).ToImmutableDictionary(c => c, c => Enumerable.Range(0, rows.Count)
                .Select(r => Cell(r, c) == "-" ? double.NaN : double.Parse(Cell(r, c), CultureInfo.InvariantCulture)).ToImmutableArray()),
            columns.Where(c => !IsNumber(c)).ToImmutableDictionary(c => c, c => Coded(Enumerable.Range(0, rows.Count)
                .Select(r => Cell(r, c) == "-" ? "" : Cell(r, c)))));
    }

    /// <summary>The panel of a table: persons, occasions and alternatives in order, whatever the order of rows.</summary>
    public static ChoicePanel PanelOf(ChoiceTable table)
    {
        var persons = table.Person.Levels;
        var alternatives = table.Alternative.Levels;
        var occasions = Enumerable.Range(0, table.Rows).Select(r => (Person: table.Person.Codes[r], Occasion: table.Occasion[r])).Distinct().Order().ToList();
        var cellRow = Enumerable.Repeat(-1, occasions.Count * alternatives.Length).ToArray();
        var chosen = new int[occasions.Count];
        for (var r = 0; r < table.Rows; r++)
        {
            var o = occasions.BinarySearch((table.Person.Codes[r], table.Occasion[r]));
            cellRow[(o * alternatives.Length) + table.Alternative.Codes[r]] = r;
            if (table.Chosen[r]) chosen[o] = table.Alternative.Codes[r];
        }

        return new ChoicePanel(
            table, persons, alternatives,
            [.. Enumerable.Range(0, persons.Length + 1).Select(p => occasions.Count(o => o.Person < p))],
            [.. occasions.Select(o => o.Person)],
            [.. occasions.Select(o => o.Occasion)],
            [.. cellRow],
            [.. cellRow.Select(r => r >= 0 && table.Offered[r])],
            [.. chosen],
            [.. persons.Select(_ => 1.0)],
            "person", persons, [.. Enumerable.Range(0, persons.Length)]);
    }

    /// <summary>Day number of an ISO date.</summary>
    public static long Day(string date) => DateOnly.ParseExact(date, "yyyy-MM-dd", CultureInfo.InvariantCulture).DayNumber;

    private static CodedColumn Coded(IEnumerable<string> values)
    {
        var list = values.ToList();
        var levels = list.Distinct().Order(StringComparer.Ordinal).ToImmutableArray();
        return new CodedColumn([.. list.Select(v => levels.IndexOf(v))], levels);
    }
}
