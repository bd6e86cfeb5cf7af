using System.Globalization;

namespace PanelChoice.Study;

/// <summary>Suggests the known name that a mistyped one was probably meant to be.</summary>
internal static class ClosestName
{
    /// <summary>A column can have any number of values, and a remedy is one line.</summary>
    private const int MostListed = 30;

    /// <summary>
    /// The closest known name by edit distance, upper and lower case being one; null when none is close: at most one edit in three
    /// letters, and never all of them. A known name that begins with what was written (three letters or more) counts as close.
    /// </summary>
    public static string? Of(string name, IEnumerable<string> known)
    {
        string? best = null;
        var least = int.MaxValue;
        var names = known.ToList();
        foreach (var candidate in names)
        {
            // So far apart in length alone; and the table of distances of two very long names would be very large.
            if (Math.Abs(candidate.Length - name.Length) > Math.Max(1, name.Length / 3)) continue;
            var distance = Distance(name.ToUpperInvariant(), candidate.ToUpperInvariant());
            if (distance >= least || distance >= candidate.Length || distance > Math.Max(1, name.Length / 3)) continue;
            (best, least) = (candidate, distance);
        }

        if (best is not null || name.Length < 3) return best;
        return names.FirstOrDefault(n => n.StartsWith(name, StringComparison.OrdinalIgnoreCase));
    }

    /// <summary>A remedy: the closest name if there is one, otherwise all known names.</summary>
    public static string Remedy(string name, IReadOnlyCollection<string> known) =>
        Of(name, known) is { } close ? $"did you mean '{close}'?"
        : known.Count == 0 ? "there is no name to choose from"
        : known.Count <= MostListed ? $"use one of: {string.Join(", ", known)}"
        : string.Create(CultureInfo.InvariantCulture, $"use one of: {string.Join(", ", known.Take(MostListed))} or the {known.Count - MostListed:#,0} others");

    /// <summary>Edits (insert, delete, replace, swap of neighbours) that turn one text into the other (Damerau 1964).</summary>
    public static int Distance(string a, string b)
    {
        var d = new int[a.Length + 1, b.Length + 1];
        for (var i = 0; i <= a.Length; i++) d[i, 0] = i;
        for (var j = 0; j <= b.Length; j++) d[0, j] = j;
        for (var i = 1; i <= a.Length; i++)
            for (var j = 1; j <= b.Length; j++)
            {
                var replace = d[i - 1, j - 1] + (a[i - 1] == b[j - 1] ? 0 : 1);
                d[i, j] = Math.Min(replace, Math.Min(d[i - 1, j], d[i, j - 1]) + 1);
                if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1]) d[i, j] = Math.Min(d[i, j], d[i - 2, j - 2] + 1);
            }

        return d[a.Length, b.Length];
    }
}
