using System.Collections.Immutable;
using System.Globalization;
using System.Numerics;

namespace PanelChoice.Data;

/// <summary>The order of ids that does not depend on the order of rows: by number when all are whole numbers, ordinal otherwise.</summary>
internal static class NameOrder
{
    /// <summary>Indices of the names in their order.</summary>
    public static int[] Of(ImmutableArray<string> names)
    {
        var order = Enumerable.Range(0, names.Length).ToArray();
        var numbers = Numbers(names);
        Array.Sort(order, (a, b) =>
        {
            var byNumber = numbers is null ? 0 : numbers[a].CompareTo(numbers[b]);
            return byNumber != 0 ? byNumber : string.CompareOrdinal(names[a], names[b]);
        });
        return order;
    }

    /// <summary>Place of each name in the order.</summary>
    public static int[] Ranks(int[] order)
    {
        var ranks = new int[order.Length];
        for (var i = 0; i < order.Length; i++) ranks[order[i]] = i;
        return ranks;
    }

    /// <summary>Whether all names are whole numbers, so that they are ordered by number.</summary>
    public static bool AreWholeNumbers(ImmutableArray<string> names) => Numbers(names) is not null;

    private static BigInteger[]? Numbers(ImmutableArray<string> names)
    {
        var numbers = new BigInteger[names.Length];
        for (var i = 0; i < names.Length; i++)
            if (!BigInteger.TryParse(names[i], NumberStyles.AllowLeadingSign, CultureInfo.InvariantCulture, out numbers[i])) return null;
        return numbers;
    }
}
