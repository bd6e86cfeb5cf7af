using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// The tree recursion on a strip: values and probabilities from the alternatives up, first derivatives from the root down. Node outside,
/// tile of lanes inside: short loops over rows in the first-level cache. Letters as in <see cref="TreeProbabilities"/> and
/// <see cref="Strip"/>; s is 1/l_m (utility-scaled) or 1 (unscaled), o is the situation's weight on the path to the choice, else 0.
/// <code>
/// up     t_c = s (W_c - max) - log sum      p_c = exp t_c      W_m = max + l log sum | l (max + log sum)     log P = sum over nodes of o_c t_c
/// down   a_c = s o_c + f_m p_c              f_m = a_m - o_m / l_m | l_m a_m - o_m,  at the root -o
/// </code>
/// </summary>
internal sealed class StripProbabilities
{
    private const int Tile = ChoiceDesign.TileLanes;

    /// <summary>exp(-700) is about 1e-304: what lies lower counts as 0. The library's exp takes a path twenty times slower from about -708 on.</summary>
    private const double LowestExponent = -700;

    private readonly StripPlan plan;
    private readonly Strip strip;

    /// <summary>The recursion on a strip.</summary>
    public StripProbabilities(StripPlan plan, Strip strip)
    {
        this.plan = plan;
        this.strip = strip;
        PathSum = new Vector512<double>[plan.Nodes];
    }

    /// <summary>Sum of o_c t_c over the children of each node and over the strip's tiles.</summary>
    public Vector512<double>[] PathSum { get; }

    /// <summary>Values, probabilities, tilts and log P.</summary>
    public void Up()
    {
        System.Runtime.InteropServices.MemoryMarshal.CreateSpan(ref strip.LogProbability, strip.Lanes).Clear();
        for (var n = 0; n < plan.Nodes; n++)
        {
            if (plan.Children[n].Length == 2) UpPair(n);
            else UpMany(n);
        }
    }

    /// <summary>First derivatives by the values of all children, and the nodes' flows.</summary>
    public void Down()
    {
        var root = plan.J + plan.Root;
        ref var weight = ref strip.OnPath(root);
        ref var flow = ref strip.Flow(plan.Root);
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile) (-Vector512.LoadUnsafe(ref weight, lane)).StoreUnsafe(ref flow, lane);
        for (var n = plan.Root; n >= 0; n--)
            foreach (var c in plan.Children[n])
            {
                DownTo(c, n);
                if (c >= plan.J) SetFlow(c - plan.J);
            }
    }

    /// <summary>s of a node.</summary>
    public double InnerScale(int node) => plan.IsScaled ? 1 / strip.Dissimilarity[node] : 1;

    private void UpMany(int n)
    {
        var children = plan.Children[n];
        var scale = Vector512.Create(InnerScale(n));
        var sumOfPath = Vector512<double>.Zero;
        ref var onPathHere = ref strip.OnPath(plan.J + n);
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
        {
            var max = Vector512.LoadUnsafe(ref strip.Value(children[0]), lane);
            for (var i = 1; i < children.Length; i++) max = Vector512.MaxNative(max, Vector512.LoadUnsafe(ref strip.Value(children[i]), lane));

            var sum = Vector512<double>.Zero;
            foreach (var c in children)
            {
                var distance = (Vector512.LoadUnsafe(ref strip.Value(c), lane) - max) * scale;
                var power = Exp(distance);
                distance.StoreUnsafe(ref strip.LogConditional(c), lane);
                power.StoreUnsafe(ref strip.Conditional(c), lane);
                sum += power;
            }

            var log = Vector512.Log(sum);
            var inverse = Vector512<double>.One / sum;
            var entropy = Vector512<double>.Zero;
            var path = Vector512<double>.Zero;
            var onPath = Vector512<double>.Zero;
            foreach (var c in children)
            {
                var t = Vector512.LoadUnsafe(ref strip.LogConditional(c), lane) - log;
                var p = Vector512.LoadUnsafe(ref strip.Conditional(c), lane) * inverse;
                var o = Vector512.LoadUnsafe(ref strip.OnPath(c), lane);
                t.StoreUnsafe(ref strip.LogConditional(c), lane);
                p.StoreUnsafe(ref strip.Conditional(c), lane);
                entropy -= p * t;
                path = Vector512.FusedMultiplyAdd(o, t, path);
                onPath += o;
            }

            Finish(n, lane, max, log, entropy, path);
            if (n != plan.Root) onPath.StoreUnsafe(ref onPathHere, lane);
            sumOfPath += path;
        }

        PathSum[n] = sumOfPath;
    }

    /// <summary>Two children need one exponential: that of minus their distance.</summary>
    private void UpPair(int n)
    {
        var scale = Vector512.Create(InnerScale(n));
        var sumOfPath = Vector512<double>.Zero;
        var (c0, c1) = (plan.Children[n][0], plan.Children[n][1]);
        ref var value0 = ref strip.Value(c0);
        ref var value1 = ref strip.Value(c1);
        ref var t0Row = ref strip.LogConditional(c0);
        ref var t1Row = ref strip.LogConditional(c1);
        ref var p0Row = ref strip.Conditional(c0);
        ref var p1Row = ref strip.Conditional(c1);
        ref var o0Row = ref strip.OnPath(c0);
        ref var o1Row = ref strip.OnPath(c1);
        ref var onPathHere = ref strip.OnPath(plan.J + n);
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
        {
            var w0 = Vector512.LoadUnsafe(ref value0, lane);
            var w1 = Vector512.LoadUnsafe(ref value1, lane);
            var distance = (w0 - w1) * scale;
            var power = Exp(-Vector512.Abs(distance));
            var sum = Vector512<double>.One + power;
            var log = Vector512.Log(sum);
            var larger = Vector512<double>.One / sum;
            var smaller = power * larger;
            var isFirstLarger = Vector512.GreaterThanOrEqual(distance, Vector512<double>.Zero);
            var p0 = Vector512.ConditionalSelect(isFirstLarger, larger, smaller);
            var p1 = Vector512.ConditionalSelect(isFirstLarger, smaller, larger);
            var t0 = Vector512.MinNative(distance, Vector512<double>.Zero) - log;
            var t1 = Vector512.MinNative(-distance, Vector512<double>.Zero) - log;
            var o0 = Vector512.LoadUnsafe(ref o0Row, lane);
            var o1 = Vector512.LoadUnsafe(ref o1Row, lane);
            t0.StoreUnsafe(ref t0Row, lane);
            t1.StoreUnsafe(ref t1Row, lane);
            p0.StoreUnsafe(ref p0Row, lane);
            p1.StoreUnsafe(ref p1Row, lane);
            var path = Vector512.FusedMultiplyAdd(o0, t0, o1 * t1);
            Finish(n, lane, Vector512.MaxNative(w0, w1), log, -(p0 * t0) - (p1 * t1), path);
            if (n != plan.Root) (o0 + o1).StoreUnsafe(ref onPathHere, lane);
            sumOfPath += path;
        }

        PathSum[n] = sumOfPath;
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private void Finish(int n, nuint lane, Vector512<double> max, Vector512<double> log, Vector512<double> entropy, Vector512<double> path)
    {
        var l = Vector512.Create(strip.Dissimilarity[n]);
        ref var value = ref strip.Value(plan.J + n);
        ref var tilt = ref strip.Tilt(n);
        if (plan.IsScaled)
        {
            Vector512.FusedMultiplyAdd(l, log, max).StoreUnsafe(ref value, lane);
            entropy.StoreUnsafe(ref tilt, lane);
        }
        else
        {
            var logSum = max + log;
            (l * logSum).StoreUnsafe(ref value, lane);
            logSum.StoreUnsafe(ref tilt, lane);
        }

        ref var logProbability = ref strip.LogProbability;
        (Vector512.LoadUnsafe(ref logProbability, lane) + path).StoreUnsafe(ref logProbability, lane);
    }

    private void DownTo(int c, int n)
    {
        var scale = Vector512.Create(InnerScale(n));
        ref var flow = ref strip.Flow(n);
        ref var p = ref strip.Conditional(c);
        ref var o = ref strip.OnPath(c);
        ref var slope = ref strip.Slope(c);
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
            Vector512.FusedMultiplyAdd(
                Vector512.LoadUnsafe(ref flow, lane), Vector512.LoadUnsafe(ref p, lane), scale * Vector512.LoadUnsafe(ref o, lane))
                .StoreUnsafe(ref slope, lane);
    }

    private void SetFlow(int m)
    {
        var l = strip.Dissimilarity[m];
        var ofSlope = Vector512.Create(plan.IsScaled ? 1 : l);
        var ofPath = Vector512.Create(plan.IsScaled ? -1 / l : -1);
        ref var slope = ref strip.Slope(plan.J + m);
        ref var o = ref strip.OnPath(plan.J + m);
        ref var flow = ref strip.Flow(m);
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
            Vector512.FusedMultiplyAdd(
                ofPath, Vector512.LoadUnsafe(ref o, lane), ofSlope * Vector512.LoadUnsafe(ref slope, lane)).StoreUnsafe(ref flow, lane);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private static Vector512<double> Exp(Vector512<double> x)
    {
        var lowest = Vector512.Create(LowestExponent);
        var power = Vector512.Exp(Vector512.MaxNative(x, lowest));
        return Vector512.ConditionalSelect(Vector512.GreaterThan(x, lowest), power, Vector512<double>.Zero);
    }
}
