using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// The part of a strip's second derivatives that comes from a node's own dissimilarity: chi, psi and the second derivative by l itself, with the
/// formulas and letters of <see cref="StripHessian"/>. t_c + E_m is taken as the distance of s (W_c - max) from its mean.
/// </summary>
internal sealed class DissimilarityTerms
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly Strip strip;
    private readonly StripProbabilities probabilities;
    private readonly HessianSums sums;
    private readonly StripRows chiOfNode;

    /// <summary>The terms of strips of the plan's design.</summary>
    public DissimilarityTerms(StripPlan plan, Strip strip, StripProbabilities probabilities, HessianSums sums)
    {
        this.plan = plan;
        this.strip = strip;
        this.probabilities = probabilities;
        this.sums = sums;
        chiOfNode = new StripRows(1, plan.StripLanes);
    }

    /// <summary>For the node at work: chi.</summary>
    private ref double Chi => ref chiOfNode.Row(0);

    /// <summary>Sets a node's chi and adds the second derivative by its own l.</summary>
    public void AddOwn(int n)
    {
        if (plan.IsScaled) AddOwnScaled(n);
        else AddOwnUnscaled(n);
    }

    private void AddOwnScaled(int n)
    {
        var above = plan.Parent[plan.J + n];
        var ofAbove = Vector512.Create(strip.Scale(above));
        var scale = Vector512.Create(strip.Scale(n));
        var ofPath = scale * scale;
        ref var entropy = ref strip.Tilt(n);
        ref var mean = ref strip.Mean(n);
        ref var largest = ref strip.Largest(n);
        ref var onPath = ref strip.OnPath(n);
        ref var flow = ref strip.FlowOverSum(n);
        ref var flowAbove = ref strip.FlowOverSum(above);
        ref var power = ref strip.Power(plan.J + n);
        ref var chi = ref Chi;
        var sum = 2 * ofPath * probabilities.PathSum[n];
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var e = Vector512.LoadUnsafe(ref entropy, lane);
            var path = ofPath * Vector512.LoadUnsafe(ref onPath, lane);
            var fromAbove = ofAbove * Vector512.LoadUnsafe(ref flowAbove, lane) * Vector512.LoadUnsafe(ref power, lane);
            var x = Vector512.FusedMultiplyAdd(fromAbove, e, path);
            x.StoreUnsafe(ref chi, lane);
            var variance = Vector512<double>.Zero;
            var max = Vector512.LoadUnsafe(ref largest, lane);
            var meanHere = Vector512.LoadUnsafe(ref mean, lane);
            foreach (var c in plan.Children[n])
            {
                var deviation = ((Vector512.LoadUnsafe(ref strip.Value(c), lane) - max) * scale) - meanHere;
                variance += Vector512.LoadUnsafe(ref strip.Power(c), lane) * deviation * deviation;
            }

            sum += (e * (x + path)) + (scale * Vector512.LoadUnsafe(ref flow, lane) * variance);
        }

        sums.Add(sums.Slot(plan.NodeParameter[n], plan.NodeParameter[n]), sum);
    }

    private void AddOwnUnscaled(int n)
    {
        var above = plan.Parent[plan.J + n];
        var l = Vector512.Create(strip.Dissimilarity[n]);
        var ofAbove = Vector512.Create(strip.Scale(above));
        ref var onPath = ref strip.OnPath(n);
        ref var tilt = ref strip.Tilt(n);
        ref var flowAbove = ref strip.FlowOverSum(above);
        ref var power = ref strip.Power(plan.J + n);
        ref var chi = ref Chi;
        var sum = Vector512<double>.Zero;
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var logSum = Vector512.LoadUnsafe(ref tilt, lane);
            var fromAbove = Vector512.LoadUnsafe(ref flowAbove, lane) * Vector512.LoadUnsafe(ref power, lane) * logSum;
            Vector512.FusedMultiplyAdd(fromAbove, l, Slopes.OfNode(ref flowAbove, ref power, ref onPath, ofAbove, lane)).StoreUnsafe(ref chi, lane);
            sum = Vector512.FusedMultiplyAdd(fromAbove, logSum, sum);
        }

        sums.Add(sums.Slot(plan.NodeParameter[n], plan.NodeParameter[n]), sum);
    }

    /// <summary>psi of a child of the node whose own terms were added last.</summary>
    /// <param name="n">The node.</param>
    /// <param name="c">The child.</param>
    /// <param name="psi">Receives it: a row.</param>
    public void SetCross(int n, int c, ref double psi)
    {
        ref var power = ref strip.Power(c);
        ref var inverse = ref strip.Inverse(n);
        ref var chi = ref Chi;
        if (!plan.IsScaled)
        {
            for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
                (Vector512.LoadUnsafe(ref power, lane) * Vector512.LoadUnsafe(ref inverse, lane) * Vector512.LoadUnsafe(ref chi, lane)).StoreUnsafe(ref psi, lane);
            return;
        }

        var scale = Vector512.Create(strip.Scale(n));
        var ofPath = scale * scale;
        var isAlternative = c < plan.J;
        ref var value = ref strip.Value(c);
        ref var largest = ref strip.Largest(n);
        ref var mean = ref strip.Mean(n);
        ref var flow = ref strip.Flow(n);
        ref var weight = ref strip.Weight;
        ref var onPath = ref strip.OnPath(isAlternative ? 0 : c - plan.J);
        ref var chosen = ref strip.Columns.Chosen(isAlternative ? c : 0);
        var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
        nuint mask = 0;
        for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
        {
            var deviation = ((Vector512.LoadUnsafe(ref value, lane) - Vector512.LoadUnsafe(ref largest, lane)) * scale) - Vector512.LoadUnsafe(ref mean, lane);
            var inside = Vector512.LoadUnsafe(ref chi, lane) - (scale * Vector512.LoadUnsafe(ref flow, lane) * deviation);
            var o = isAlternative ? TileMask.Lanes(Unsafe.Add(ref chosen, mask)) & Vector512.LoadUnsafe(ref weight, lane) : Vector512.LoadUnsafe(ref onPath, lane);
            ((Vector512.LoadUnsafe(ref power, lane) * Vector512.LoadUnsafe(ref inverse, lane) * inside) - (ofPath * o)).StoreUnsafe(ref psi, lane);
        }
    }
}
