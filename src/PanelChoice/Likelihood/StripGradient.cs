using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// Sums first derivatives over strips, in one vector for each parameter: for a coefficient the sum of a_j x_j over alternatives, for the
/// dissimilarity of node m the sum of f_m E_m - (sum of o_c t_c) / l_m (utility-scaled) or a_m L_m (unscaled). Letters as in
/// <see cref="StripProbabilities"/>. The slopes a_j are worked out where they are used and never written down.
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
        for (var j = 0; j < plan.J; j++) AddAlternative(j);
        for (var m = 0; m < plan.Root; m++)
            if (plan.NodeParameter[m] is >= 0 and var parameter)
                sums[parameter] += plan.IsScaled ? SumOfFlow(m) - (probabilities.PathSum[m] / strip.Dissimilarity[m]) : SumOfSlope(m);
    }

    /// <summary>Adds the sums to a gradient of K and starts again from zero.</summary>
    public void Flush(Span<double> gradient)
    {
        for (var k = 0; k < plan.K; k++) gradient[k] += Vector512.Sum(sums[k]) / plan.Units[k];
        Array.Clear(sums);
    }

    private void AddAlternative(int alternative)
    {
        var leaf = plan.Leaves[alternative];
        for (var i = 0; i < leaf.Groups.Length; i++)
        {
            var loop = new SlopeLoop(plan, strip, alternative, sums, i == 0 ? leaf.Constants : []);
            leaf.Groups[i].Run(ref loop);
        }

        if (leaf.Groups.Length > 0 || leaf.Constants.Length == 0) return;
        ref var g = ref strip.FlowOverSum(plan.Parent[alternative]);
        ref var e = ref strip.Power(alternative);
        ref var weight = ref strip.Weight;
        ref var chosen = ref strip.Columns.Chosen(alternative);
        var scale = Vector512.Create(strip.Scale(plan.Parent[alternative]));
        var sum = Vector512<double>.Zero;
        var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
        nuint mask = 0;
        for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
            sum += Slopes.OfAlternative(ref g, ref e, ref weight, Unsafe.Add(ref chosen, mask), scale, lane);
        foreach (var k in leaf.Constants) sums[k] += sum;
    }

    private Vector512<double> SumOfFlow(int m)
    {
        ref var flow = ref strip.Flow(m);
        ref var tilt = ref strip.Tilt(m);
        var sum = Vector512<double>.Zero;
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
            sum = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref flow, lane), Vector512.LoadUnsafe(ref tilt, lane), sum);
        return sum;
    }

    private Vector512<double> SumOfSlope(int m)
    {
        ref var g = ref strip.FlowOverSum(plan.Parent[plan.J + m]);
        ref var e = ref strip.Power(plan.J + m);
        ref var o = ref strip.OnPath(m);
        var scale = Vector512.Create(strip.Scale(plan.Parent[plan.J + m]));
        ref var tilt = ref strip.Tilt(m);
        var sum = Vector512<double>.Zero;
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
            sum = Vector512.FusedMultiplyAdd(Slopes.OfNode(ref g, ref e, ref o, scale, lane), Vector512.LoadUnsafe(ref tilt, lane), sum);
        return sum;
    }

    /// <summary>Adds the products of an alternative's slopes with a group's columns, and the slopes themselves for its constants.</summary>
    private readonly struct SlopeLoop(StripPlan plan, Strip strip, int alternative, Vector512<double>[] sums, int[] constants) : IColumnLoop
    {
        public void Run<THeld, TCount>(ColumnGroup group)
            where THeld : struct, IHeldAs
            where TCount : struct, IColumnCount
        {
            var columns = strip.Columns;
            ref var g = ref strip.FlowOverSum(plan.Parent[alternative]);
            ref var e = ref strip.Power(alternative);
            ref var weight = ref strip.Weight;
            ref var chosen = ref strip.Columns.Chosen(alternative);
            var scale = Vector512.Create(strip.Scale(plan.Parent[alternative]));
            ref var x0 = ref columns.Held<THeld, TCount>(group, 0);
            ref var x1 = ref columns.Held<THeld, TCount>(group, 1);
            ref var x2 = ref columns.Held<THeld, TCount>(group, 2);
            ref var x3 = ref columns.Held<THeld, TCount>(group, 3);
            ref var x4 = ref columns.Held<THeld, TCount>(group, 4);
            ref var x5 = ref columns.Held<THeld, TCount>(group, 5);
            var sum = Vector512<double>.Zero;
            var (s0, s1, s2) = (sum, sum, sum);
            var (s3, s4, s5) = (sum, sum, sum);
            var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
            nuint mask = 0;
            for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
            {
                var slope = Slopes.OfAlternative(ref g, ref e, ref weight, Unsafe.Add(ref chosen, mask), scale, lane);
                sum += slope;
                s0 = Vector512.FusedMultiplyAdd(slope, THeld.Load(ref x0, lane), s0);
                if (TCount.Value > 1) s1 = Vector512.FusedMultiplyAdd(slope, THeld.Load(ref x1, lane), s1);
                if (TCount.Value > 2) s2 = Vector512.FusedMultiplyAdd(slope, THeld.Load(ref x2, lane), s2);
                if (TCount.Value > 3) s3 = Vector512.FusedMultiplyAdd(slope, THeld.Load(ref x3, lane), s3);
                if (TCount.Value > 4) s4 = Vector512.FusedMultiplyAdd(slope, THeld.Load(ref x4, lane), s4);
                if (TCount.Value > 5) s5 = Vector512.FusedMultiplyAdd(slope, THeld.Load(ref x5, lane), s5);
            }

            foreach (var k in constants) sums[k] += sum;
            sums[group.Parameters[0]] += s0;
            if (TCount.Value > 1) sums[group.Parameters[1]] += s1;
            if (TCount.Value > 2) sums[group.Parameters[2]] += s2;
            if (TCount.Value > 3) sums[group.Parameters[3]] += s3;
            if (TCount.Value > 4) sums[group.Parameters[4]] += s4;
            if (TCount.Value > 5) sums[group.Parameters[5]] += s5;
        }
    }
}
