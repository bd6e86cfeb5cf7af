using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>Dissimilarities to start from: common values, coarse grids over few nests, seeded draws; child at most parent in all of them.</summary>
internal sealed class StartingPoints
{
    private static readonly double[] Common = [1, 0.85, 0.7, 0.55, 0.42, 0.3, 0.2, 0.12, 0.07, 0.05];

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

    /// <summary>A grid of dissimilarities: for each point its values (one for each free dissimilarity) and its neighbours in the grid.</summary>
    public ImmutableArray<(double[] Values, ImmutableArray<int> Neighbours)> Grid()
    {
        double[] levels = free.Length switch { 2 => [1, 0.7, 0.45, 0.2, 0.05], 3 => [1, 0.4, 0.1], _ => Common };
        var axes = free.Length is 2 or 3 ? free.Length : 1;
        var total = (int)Math.Pow(levels.Length, axes);
        var placeOf = new Dictionary<int, int>();
        var points = new List<(int[] Index, double[] Values)>();
        for (var i = 0; i < total; i++)
        {
            // Boustrophedon order: each point differs from the one before on one axis by one level, so that it is a good start for it.
            var index = Snake(i, levels.Length, axes);
            double[] values = axes == 1 ? [.. free.Select(_ => levels[index[0]])] : [.. index.Select(q => levels[q])];
            if (axes > 1 && !IsOrdered(values)) continue;
            placeOf[Number(index, levels.Length)] = points.Count;
            points.Add((index, values));
        }

        return [.. points.Select(p => (p.Values, Neighbours(p.Index, levels.Length, placeOf)))];
    }

    /// <summary>
    /// K parameters with the given dissimilarities; in the utility-scaled form none is larger than its parent's. Coefficients and fixed
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
            if (free.Contains(k)) at[k] = Math.Min(at[k], above < 0 ? 1 : at[above]);
        }

        return at;
    }

    /// <summary>A seeded point: dissimilarities log-uniform between 0.05 and 1, coefficients spread around a fit.</summary>
    /// <param name="around">K parameters to spread around.</param>
    /// <param name="active">Parameters that move.</param>
    /// <param name="scale">Scale of each column.</param>
    /// <param name="seed">The user's seed.</param>
    /// <param name="number">Number of the point.</param>
    public double[] Seeded(ReadOnlySpan<double> around, ImmutableArray<int> active, double[] scale, long seed, int number)
    {
        var random = new CounterRandom(seed, "starts", number);
        var at = With(around, [.. free.Select(_ => Math.Exp(Math.Log(0.05) * random.NextDouble()))]);
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

    private static int[] Snake(int i, int levels, int axes)
    {
        var index = new int[axes];
        for (var a = axes - 1; a >= 0; a--)
        {
            index[a] = i % levels;
            i /= levels;
        }

        var reversed = false;
        for (var a = 0; a < axes; a++)
        {
            if (reversed) index[a] = levels - 1 - index[a];
            reversed ^= index[a] % 2 == 1;
        }

        return index;
    }

    private static int Number(int[] index, int levels)
    {
        var number = 0;
        foreach (var q in index) number = (number * levels) + q;
        return number;
    }

    private static ImmutableArray<int> Neighbours(int[] index, int levels, Dictionary<int, int> placeOf)
    {
        var found = ImmutableArray.CreateBuilder<int>();
        for (var a = 0; a < index.Length; a++)
            for (var by = -1; by <= 1; by += 2)
            {
                var next = (int[])index.Clone();
                next[a] += by;
                if (next[a] >= 0 && next[a] < levels && placeOf.TryGetValue(Number(next, levels), out var place)) found.Add(place);
            }

        return found.ToImmutable();
    }
}
