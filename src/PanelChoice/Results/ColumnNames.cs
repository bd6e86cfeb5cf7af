using System.Collections.Immutable;

namespace PanelChoice.Results;

/// <summary>Distinct names for the columns of a table, where a term and a nest may be called the same.</summary>
internal static class ColumnNames
{
    public static ImmutableArray<string> Distinct(IEnumerable<string> labels, IEnumerable<string> taken)
    {
        var used = new HashSet<string>(taken, StringComparer.Ordinal);
        var names = ImmutableArray.CreateBuilder<string>();
        foreach (var label in labels)
        {
            var name = label;
            for (var copy = 2; !used.Add(name); copy++) name = $"{label} ({copy})";
            names.Add(name);
        }

        return names.ToImmutable();
    }
}
