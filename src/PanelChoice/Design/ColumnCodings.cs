using System.Collections.Immutable;
using PanelChoice.Covariates;

namespace PanelChoice.Design;

/// <summary>
/// Chooses how each stored column is held. Recorded times, costs and counts have few decimals: held as whole numbers they take a quarter of
/// the memory, and a pass over a large panel waits for memory. A coding is chosen only where every value comes back equal.
/// </summary>
internal static class ColumnCodings
{
    /// <summary>The codings of all stored columns, in order.</summary>
    /// <param name="columns">The design's columns.</param>
    /// <param name="covariates">Their covariates, by parameter.</param>
    public static ImmutableArray<StoredColumn> Of(ImmutableArray<DesignColumn> columns, ImmutableArray<Covariate> covariates)
    {
        var byParameter = covariates.Select(c => c.IsConstant ? [] : OfCovariate(c)).ToArray();
        return
        [
            .. columns.Where(c => c.Storage >= 0).OrderBy(c => c.Storage)
                .Select(c => byParameter[c.Parameter][covariates[c.Parameter].Enters.IndexOf(c.Alternative)]),
        ];
    }

    /// <summary>
    /// One coding for each alternative. The number of decimals is common to them, so that a coefficient can take over the unit; where no
    /// number of decimals fits all of them, those that are whole numbers are held as such and the others as they are.
    /// </summary>
    private static ImmutableArray<StoredColumn> OfCovariate(Covariate covariate)
    {
        for (var decimals = 0; decimals < StoredColumn.PowersOfTen.Length; decimals++)
        {
            var codings = Codings(covariate, decimals);
            if (!codings.Contains(ColumnCoding.AsIs)) return [.. codings.Select(c => new StoredColumn(c, decimals))];
        }

        return [.. Codings(covariate, 0).Select(c => new StoredColumn(c, 0))];
    }

    private static ColumnCoding[] Codings(Covariate covariate, int decimals)
    {
        var width = covariate.Enters.Length;
        var values = covariate.Values.AsSpan();
        var units = StoredColumn.PowersOfTen[decimals];
        var codings = new ColumnCoding[width];
        for (var a = 0; a < width; a++)
        {
            codings[a] = ColumnCoding.Whole16;
            for (var i = a; i < values.Length && codings[a] != ColumnCoding.AsIs; i += width)
            {
                var n = Math.Round(values[i] * units);
                if (!(Math.Abs(n) <= int.MaxValue) || n / units != values[i]) codings[a] = ColumnCoding.AsIs;
                else if (Math.Abs(n) > short.MaxValue) codings[a] = ColumnCoding.Whole32;
            }
        }

        return codings;
    }
}
