using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// Sums first derivatives over strips, in one vector for each parameter: for a coefficient the sum of a_j x_j over alternatives, for the
/// dissimilarity of node m the sum of f_m E_m - (sum of o_c t_c) / l_m (utility-scaled) or a_m L_m (unscaled).
/// </summary>
internal sealed class StripGradient
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly Strip strip;
    private readonly StripProbabilities probabilities;
    private readonly Vector512<double>[] sums;

    /// <summary>Sums over strips of the plan's design.</summary>
    public StripGradient(StripPlan plan, Strip strip, StripProbabilities probabilities)
    {
        this.plan = plan;
        this.strip = strip;
        this.probabilities = probabilities;
        sums = new Vector512<double>[plan.K];
    }

    /// <summary>Adds the strip.</summary>
    public void Add()
    {
        for (var j = 0; j < plan.J; j++) AddColumns(plan.Leaves[j], ref strip.Slope(j));
        for (var n = 0; n < plan.Nodes; n++)
        {
            if (plan.NodeParameter[n] is not (>= 0 and var parameter)) continue;
            if (plan.IsScaled) sums[parameter] += Dot(ref strip.Flow(n), ref strip.Tilt(n)) - (probabilities.PathSum[n] / strip.Dissimilarity[n]);
            else sums[parameter] += Dot(ref strip.Slope(plan.J + n), ref strip.Tilt(n));
        }
    }

    /// <summary>Adds the sums to a gradient of K and starts again from zero.</summary>
    public void Flush(Span<double> gradient)
    {
        for (var k = 0; k < plan.K; k++) gradient[k] += Vector512.Sum(sums[k]) / plan.Units[k];
        Array.Clear(sums);
    }

    /// <summary>Writes the derivatives of each lane, lanes x K; weights must be 1.</summary>
    public void WriteLanes(Span<double> scores)
    {
        var count = scores.Length / plan.K;
        scores.Clear();
        for (var j = 0; j < plan.J; j++)
        {
            ref var slope = ref strip.Slope(j);
            var leaf = plan.Leaves[j];
            for (var i = 0; i < leaf.Stored.Length; i++)
                AddLanes(ref slope, ref strip.Columns.Column(leaf.Places[i]), 1 / plan.Units[leaf.Stored[i]], scores, leaf.Stored[i], count);
            foreach (var k in leaf.Constants)
                for (var lane = 0; lane < count; lane++) scores[(lane * plan.K) + k] += Unsafe.Add(ref slope, lane);
        }

        for (var n = 0; n < plan.Nodes; n++)
        {
            if (plan.NodeParameter[n] is not (>= 0 and var parameter)) continue;
            if (!plan.IsScaled)
            {
                AddLanes(ref strip.Slope(plan.J + n), ref strip.Tilt(n), 1, scores, parameter, count);
                continue;
            }

            AddLanes(ref strip.Flow(n), ref strip.Tilt(n), 1, scores, parameter, count);
            foreach (var c in plan.Children[n])
                for (var lane = 0; lane < count; lane++)
                    scores[(lane * plan.K) + parameter] -= Unsafe.Add(ref strip.OnPath(c), lane) * Unsafe.Add(ref strip.LogConditional(c), lane) / strip.Dissimilarity[n];
        }
    }

    private void AddLanes(ref double left, ref double right, double factor, Span<double> scores, int parameter, int count)
    {
        for (var lane = 0; lane < count; lane++) scores[(lane * plan.K) + parameter] += factor * Unsafe.Add(ref left, lane) * Unsafe.Add(ref right, lane);
    }

    private void AddColumns(LeafColumns leaf, ref double slope)
    {
        var i = 0;
        for (; i + 4 <= leaf.Stored.Length; i += 4)
        {
            ref var x0 = ref strip.Columns.Column(leaf.Places[i]);
            ref var x1 = ref strip.Columns.Column(leaf.Places[i + 1]);
            ref var x2 = ref strip.Columns.Column(leaf.Places[i + 2]);
            ref var x3 = ref strip.Columns.Column(leaf.Places[i + 3]);
            var s0 = Vector512<double>.Zero;
            var s1 = Vector512<double>.Zero;
            var s2 = Vector512<double>.Zero;
            var s3 = Vector512<double>.Zero;
            for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
            {
                var a = Vector512.LoadUnsafe(ref slope, lane);
                s0 = Vector512.FusedMultiplyAdd(a, Vector512.LoadUnsafe(ref x0, lane), s0);
                s1 = Vector512.FusedMultiplyAdd(a, Vector512.LoadUnsafe(ref x1, lane), s1);
                s2 = Vector512.FusedMultiplyAdd(a, Vector512.LoadUnsafe(ref x2, lane), s2);
                s3 = Vector512.FusedMultiplyAdd(a, Vector512.LoadUnsafe(ref x3, lane), s3);
            }

            sums[leaf.Stored[i]] += s0;
            sums[leaf.Stored[i + 1]] += s1;
            sums[leaf.Stored[i + 2]] += s2;
            sums[leaf.Stored[i + 3]] += s3;
        }

        for (; i < leaf.Stored.Length; i++) sums[leaf.Stored[i]] += Dot(ref slope, ref strip.Columns.Column(leaf.Places[i]));
        if (leaf.Constants.Length == 0) return;
        var sum = Vector512<double>.Zero;
        foreach (var a in MemoryMarshal.Cast<double, Vector512<double>>(MemoryMarshal.CreateReadOnlySpan(ref slope, strip.Lanes))) sum += a;
        foreach (var k in leaf.Constants) sums[k] += sum;
    }

    private Vector512<double> Dot(ref double left, ref double right)
    {
        var sum = Vector512<double>.Zero;
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
            sum = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref left, lane), Vector512.LoadUnsafe(ref right, lane), sum);
        return sum;
    }
}
