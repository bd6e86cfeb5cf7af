using PanelChoice.Data;

namespace PanelChoice.Panels;

/// <summary>The rows of a table by person, then occasion, then alternative, and for equal ones by their place in the file.</summary>
/// <param name="Rows">Row indices in that order.</param>
/// <param name="PersonStart">First entry of each person in <paramref name="Rows"/>; one more entry closes the last person.</param>
internal sealed record RowOrder(int[] Rows, int[] PersonStart)
{
    /// <summary>Sorts the rows of a table.</summary>
    /// <param name="table">The table.</param>
    /// <param name="rankOf">Place of each person code in the order of persons.</param>
    public static RowOrder Of(ChoiceTable table, int[] rankOf)
    {
        var codes = table.Person.Codes.AsSpan();
        var start = new int[rankOf.Length + 1];
        foreach (var code in codes) start[rankOf[code] + 1]++;
        for (var p = 0; p < rankOf.Length; p++) start[p + 1] += start[p];
        var next = start[..^1];
        var rows = new int[codes.Length];
        for (var row = 0; row < codes.Length; row++) rows[next[rankOf[codes[row]]]++] = row;
        for (var p = 0; p < rankOf.Length; p++)
        {
            var own = rows.AsSpan(start[p]..start[p + 1]);
            if (!IsSorted(own, table)) own.Sort((a, b) => Compare(a, b, table));
        }

        return new RowOrder(rows, start);
    }

    private static bool IsSorted(ReadOnlySpan<int> rows, ChoiceTable table)
    {
        for (var i = 1; i < rows.Length; i++) if (Compare(rows[i - 1], rows[i], table) > 0) return false;
        return true;
    }

    private static int Compare(int a, int b, ChoiceTable table)
    {
        var byOccasion = table.Occasion[a].CompareTo(table.Occasion[b]);
        if (byOccasion != 0) return byOccasion;
        var byAlternative = table.Alternative.Codes[a].CompareTo(table.Alternative.Codes[b]);
        return byAlternative != 0 ? byAlternative : a.CompareTo(b);
    }
}
