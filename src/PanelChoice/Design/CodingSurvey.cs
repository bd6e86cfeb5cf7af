using System.Collections.Immutable;
using PanelChoice.Covariates;

namespace PanelChoice.Design;

/// <summary>
/// Chooses how the stored columns of a covariate are held, from values that come part by part. Recorded times, costs and counts have few decimals: held as
/// whole numbers they take a quarter of the memory, and a pass over a large panel waits for memory. A coding is chosen only where every value comes back
/// equal. A value that comes back with some number of decimals comes back with every larger one, as long as its whole number fits: so the largest number
/// of decimals that any value needs, and the largest value, decide.
/// </summary>
/// <param name="alternatives">Number of alternatives the covariate enters.</param>
internal sealed class CodingSurvey(int alternatives)
{
    private readonly bool[] isWhole = [.. Enumerable.Repeat(true, alternatives)];
    private readonly double[] largest = new double[alternatives];
    private int decimals;

    /// <summary>Looks at the values of a part.</summary>
    public void Add(Covariate covariate)
    {
        var values = covariate.Values.AsSpan();
        for (int i = 0, a = 0; i < values.Length; i++, a = a + 1 == largest.Length ? 0 : a + 1)
        {
            var size = Math.Abs(values[i]);
            if (!(size <= largest[a])) largest[a] = size;
            if (isWhole[a] && !ComesBack(values[i], 0)) isWhole[a] = false;
            while (decimals < StoredColumn.PowersOfTen.Length && !ComesBack(values[i], decimals)) decimals++;
        }
    }

    /// <summary>
    /// One coding for each alternative. The number of decimals is common to them, so that a coefficient can take over the unit; where no
    /// number of decimals fits all of them, those that are whole numbers are held as such and the others as they are.
    /// </summary>
    public ImmutableArray<StoredColumn> Codings()
    {
        var fits = decimals < StoredColumn.PowersOfTen.Length && Array.TrueForAll(largest, v => Units(v, decimals) <= int.MaxValue);
        return
        [
            .. largest.Select((v, a) => fits ? new StoredColumn(Whole(v, decimals), decimals)
                : isWhole[a] ? new StoredColumn(Whole(v, 0), 0)
                : new StoredColumn(ColumnCoding.AsIs, 0)),
        ];
    }

    private static bool ComesBack(double value, int decimals)
    {
        var units = StoredColumn.PowersOfTen[decimals];
        var n = Math.Round(value * units);
        return Math.Abs(n) <= int.MaxValue && n / units == value;
    }

    private static double Units(double value, int decimals) => Math.Round(value * StoredColumn.PowersOfTen[decimals]);

    private static ColumnCoding Whole(double value, int decimals) => Units(value, decimals) > short.MaxValue ? ColumnCoding.Whole32 : ColumnCoding.Whole16;
}
