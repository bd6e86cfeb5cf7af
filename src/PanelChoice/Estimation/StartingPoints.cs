using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>
/// Dissimilarities to start from: common values, coarse grids over few nests, seeded draws; child at most parent in all of them. Grids go on
/// above 1, where the likelihood is no longer concave in the coefficients, and below 0.05: without these ends 19 of 14,458 small panels kept a
/// better maximum or an edge hidden from all starts, with them one of 12,609.
/// </summary>
internal sealed class StartingPoints
{
    private static readonly double[] Common = [1, 1.5, 2.5, 5, 10, 0.85, 0.7, 0.55, 0.42, 0.3, 0.2, 0.12, 0.07, 0.05, 0.02, 0.005];

    private readonly ChoiceDesign design;
    private readonly NestedLogitForm form;
    private readonly ImmutableArray<int> free;

    public StartingPoints(ChoiceDesign design, NestedLogitForm form)
    {
        this.design = design;
        this.form = form;
        free = [.. design.Layout.Free.Where(k => k >= design.Layout.Coefficients)];
    }

    /// <summary>The free dissimilarities.</summary>
    public ImmutableArray<int> Free => free;

    /// <summary>
    /// A grid of dissimilarities, plain logit first: for each point its values (one for each free dissimilarity) and its neighbours in the grid.
    /// </summary>
    public ImmutableArray<(double[] Values, ImmutableArray<int> Neighbours)> Grid()
    {
        double[] values = free.Length switch { 2 => [1, 2.5, 0.7, 0.45, 0.2, 0.05], 3 => [1, 0.4, 0.1], _ => Common };
        int[] rank = [.. values.Select(v => values.Count(w => w < v))];
        var axes = free.Length is 2 or 3 ? free.Length : 1;
        var points = new List<(int[] Rank, double[] Values)>();
        for (var i = 0; i < (int)Math.Pow(values.Length, axes); i++)
        {
            var index = new int[axes];
            for (int a = axes - 1, rest = i; a >= 0; a--, rest /= values.Length) index[a] = rest % values.Length;
            double[] at = axes == 1 ? [.. free.Select(_ => values[index[0]])] : [.. index.Select(q => values[q])];
            if (axes == 1 || IsOrdered(at)) points.Add(([.. index.Select(q => rank[q])], at));
        }

        return [.. points.Select(p => (p.Values, (ImmutableArray<int>)[.. Enumerable.Range(0, points.Count).Where(q => AreNeighbours(p.Rank, points[q].Rank))]))];
    }

    /// <summary>
    /// K parameters with the given dissimilarities; in the utility-scaled form none is larger than that of the nest above. Coefficients and fixed
    /// dissimilarities are kept.
    /// </summary>
    /// <param name="parameters">K parameters.</param>
    /// <param name="values">One value for each free dissimilarity.</param>
    public double[] With(ReadOnlySpan<double> parameters, ReadOnlySpan<double> values)
    {
        var at = parameters.ToArray();
        for (var i = 0; i < free.Length; i++) at[free[i]] = values[i];
        if (form == NestedLogitForm.Unscaled) return at;
        // Parents come after their children in the tree, so the walk goes backwards.
        for (var n = design.Tree.Root - 1; n >= 0; n--)
        {
            var k = design.Layout.NodeParameter[n];
            var above = NestOrder.Above(design, form, n);
            if (free.Contains(k) && above >= 0) at[k] = Math.Min(at[k], at[above]);
        }

        return at;
    }

    /// <summary>A seeded point: dissimilarities log-uniform between 0.05 and 2, coefficients spread around a fit.</summary>
    /// <param name="around">K parameters to spread around.</param>
    /// <param name="active">Parameters that move.</param>
    /// <param name="scale">Scale of each column.</param>
    /// <param name="seed">The user's seed.</param>
    /// <param name="number">Number of the point.</param>
    public double[] Seeded(ReadOnlySpan<double> around, ImmutableArray<int> active, double[] scale, long seed, int number)
    {
        var random = new CounterRandom(seed, "starts", number);
        var at = With(around, [.. free.Select(_ => 0.05 * Math.Pow(40, random.NextDouble()))]);
        foreach (var k in active)
        {
            if (k >= design.Layout.Coefficients) continue;
            var utility = at[k] * scale[k];
            at[k] = (utility + (0.5 * (1 + Math.Abs(utility)) * MathNet.Numerics.Distributions.Normal.Sample(random, 0, 1))) / scale[k];
        }

        return at;
    }

    /// <summary>Whether the fixed dissimilarities are in the order in which the likelihood is concave in the coefficients.</summary>
    public bool FixedAreInOrder()
    {
        foreach (var place in design.Layout.Nests)
        {
            if (!NestOrder.Matters(place, form) || design.Layout.Parameters[place.Parameter].Fixed is not { } own) continue;
            var above = NestOrder.Above(design, form, place.Node);
            if (own > (above < 0 ? 1 : design.Layout.Parameters[above].Fixed ?? double.PositiveInfinity)) return false;
        }

        return true;
    }

    private bool IsOrdered(double[] values)
    {
        if (form == NestedLogitForm.Unscaled) return true;
        foreach (var place in design.Layout.Nests)
        {
            var own = free.IndexOf(place.Parameter);
            var above = free.IndexOf(NestOrder.Above(design, form, place.Node));
            if (own >= 0 && above >= 0 && values[own] > values[above]) return false;
        }

        return true;
    }

    private static bool AreNeighbours(int[] one, int[] other)
    {
        var apart = 0;
        for (var a = 0; a < one.Length; a++) apart += Math.Abs(one[a] - other[a]);
        return apart == 1;
    }
}
