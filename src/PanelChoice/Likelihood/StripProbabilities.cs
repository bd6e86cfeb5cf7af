using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;
using PanelChoice.Numerics;

namespace PanelChoice.Likelihood;

/// <summary>
/// The tree recursion on a strip: values and probabilities from the alternatives up, first derivatives from the root down. Node outside,
/// tile of lanes inside: short loops over rows that stay in the cache. The exponential of 512-bit machines is small enough to stand where its
/// argument is made; the portable one has loops of its own, without which its constants would not stay in registers. Letters as in <see cref="TreeProbabilities"/> and
/// <see cref="Strip"/>; s is 1/l_m (utility-scaled) or 1 (unscaled), o is the situation's weight on the path to the choice, else 0.
/// <code>
/// up     t_c = s (W_c - max) - log sum      p_c = exp t_c      W_m = max + l log sum | l (max + log sum)     log P = sum over nodes of o_c t_c
/// down   a_c = s o_c + f_m p_c              f_m = a_m - o_m / l_m | l_m a_m - o_m,  at the root -o
/// </code>
/// </summary>
internal sealed class StripProbabilities
{
    private const int Tile = ChoiceDesign.TileLanes;

    private readonly StripPlan plan;
    private readonly Strip strip;

    /// <summary>Place of each node's children: their distance from the first child number's lane in any group of rows.</summary>
    private readonly nuint[][] places;

    /// <summary>The recursion on a strip.</summary>
    public StripProbabilities(StripPlan plan, Strip strip)
    {
        this.plan = plan;
        this.strip = strip;
        places = [.. plan.Children.Select(children => children.Select(c => (nuint)(c * strip.Stride)).ToArray())];
        PathSum = new Vector512<double>[plan.Nodes];
    }

    /// <summary>Sum of o_c t_c over the children of each node and over the strip's tiles.</summary>
    public Vector512<double>[] PathSum { get; }

    /// <summary>Weight times log P of the choice, summed over the strip's tiles.</summary>
    public Vector512<double> LogLikelihood
    {
        get
        {
            var sum = Vector512<double>.Zero;
            foreach (var path in PathSum) sum += path;
            return sum;
        }
    }

    /// <summary>Values, probabilities and tilts. Of the root only what its children's slopes and log P need is kept.</summary>
    public void Up()
    {
        for (var n = 0; n < plan.Nodes; n++)
        {
            PathSum[n] = plan.Children[n].Length == 2 ? UpPair(n) : UpMany(n);
            if (n != plan.Root) SetValue(n);
        }
    }

    /// <summary>Weight times log P of each lane, from the rows that <see cref="Up"/> left.</summary>
    public void WriteLogProbabilities(Span<double> log)
    {
        log.Clear();
        for (var n = 0; n < plan.Nodes; n++)
            foreach (var c in plan.Children[n])
                for (var lane = 0; lane < log.Length; lane++)
                    log[lane] += Unsafe.Add(ref strip.OnPath(c), lane) * Unsafe.Add(ref strip.LogConditional(c), lane);
    }

    /// <summary>First derivatives by the values of all children, and the nodes' flows.</summary>
    public void Down()
    {
        ref var weight = ref strip.OnPath(plan.J + plan.Root);
        ref var flow = ref strip.Flow(plan.Root);
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile) (-Vector512.LoadUnsafe(ref weight, lane)).StoreUnsafe(ref flow, lane);
        for (var n = plan.Root; n >= 0; n--)
            foreach (var c in plan.Children[n])
            {
                DownTo(c, n);
                if (c >= plan.J) SetFlow(c - plan.J);
            }
    }

    private double InnerScale(int node) => plan.IsScaled ? 1 / strip.Dissimilarity[node] : 1;

    private Vector512<double> UpMany(int n)
    {
        var lanes = (nuint)strip.Lanes;
        ref var largest = ref strip.Largest;
        ref var sum = ref strip.Sum;
        ref var value = ref strip.Value(0);
        ref var t = ref strip.LogConditional(0);
        ref var p = ref strip.Conditional(0);
        ReadOnlySpan<nuint> children = places[n];
        var scale = Vector512.Create(InnerScale(n));
        for (nuint lane = 0; lane < lanes; lane += Tile)
        {
            var max = Vector512.LoadUnsafe(ref value, children[0] + lane);
            foreach (var c in children) max = Vector512.MaxNative(max, Vector512.LoadUnsafe(ref value, c + lane));
            max.StoreUnsafe(ref largest, lane);
            var total = Vector512<double>.Zero;
            foreach (var c in children)
            {
                var distance = (Vector512.LoadUnsafe(ref value, c + lane) - max) * scale;
                distance.StoreUnsafe(ref t, c + lane);
                if (!WideElementary.IsSupported) continue;
                var power = WideElementary.Exp(distance);
                power.StoreUnsafe(ref p, c + lane);
                total += power;
            }

            if (WideElementary.IsSupported) total.StoreUnsafe(ref sum, lane);
        }

        if (!WideElementary.IsSupported)
        {
            foreach (var c in children) VectorFunctions.Exp(ref Unsafe.Add(ref t, c), ref Unsafe.Add(ref p, c), lanes);
            for (nuint lane = 0; lane < lanes; lane += Tile)
            {
                var total = Vector512<double>.Zero;
                foreach (var c in children) total += Vector512.LoadUnsafe(ref p, c + lane);
                total.StoreUnsafe(ref sum, lane);
            }
        }

        VectorFunctions.Log(ref sum, ref strip.LogOfSum, lanes);
        return n == plan.Root ? NormaliseRoot(children) : Normalise(n, children);
    }

    /// <summary>Divides by the sum; entropy, and whether the choice lies below the node.</summary>
    private Vector512<double> Normalise(int n, ReadOnlySpan<nuint> children)
    {
        ref var sum = ref strip.Sum;
        ref var log = ref strip.LogOfSum;
        ref var t = ref strip.LogConditional(0);
        ref var p = ref strip.Conditional(0);
        ref var o = ref strip.OnPath(0);
        ref var oOfNode = ref strip.OnPath(plan.J + n);
        ref var tilt = ref strip.Tilt(n);
        var sumOfPath = Vector512<double>.Zero;
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
        {
            var logHere = Vector512.LoadUnsafe(ref log, lane);
            var inverse = Vector512<double>.One / Vector512.LoadUnsafe(ref sum, lane);
            var entropy = Vector512<double>.Zero;
            var path = Vector512<double>.Zero;
            var onPath = Vector512<double>.Zero;
            foreach (var c in children)
            {
                var tHere = Vector512.LoadUnsafe(ref t, c + lane) - logHere;
                var pHere = Vector512.LoadUnsafe(ref p, c + lane) * inverse;
                var oHere = Vector512.LoadUnsafe(ref o, c + lane);
                tHere.StoreUnsafe(ref t, c + lane);
                pHere.StoreUnsafe(ref p, c + lane);
                entropy -= pHere * tHere;
                path = Vector512.FusedMultiplyAdd(oHere, tHere, path);
                onPath += oHere;
            }

            entropy.StoreUnsafe(ref tilt, lane);
            onPath.StoreUnsafe(ref oOfNode, lane);
            sumOfPath += path;
        }

        return sumOfPath;
    }

    /// <summary>Divides by the sum: the root has neither a dissimilarity nor a node above, so that nobody asks for its entropy.</summary>
    private Vector512<double> NormaliseRoot(ReadOnlySpan<nuint> children)
    {
        ref var sum = ref strip.Sum;
        ref var log = ref strip.LogOfSum;
        ref var t = ref strip.LogConditional(0);
        ref var p = ref strip.Conditional(0);
        ref var o = ref strip.OnPath(0);
        var sumOfPath = Vector512<double>.Zero;
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
        {
            var logHere = Vector512.LoadUnsafe(ref log, lane);
            var inverse = Vector512<double>.One / Vector512.LoadUnsafe(ref sum, lane);
            var path = Vector512<double>.Zero;
            foreach (var c in children)
            {
                var tHere = Vector512.LoadUnsafe(ref t, c + lane) - logHere;
                tHere.StoreUnsafe(ref t, c + lane);
                (Vector512.LoadUnsafe(ref p, c + lane) * inverse).StoreUnsafe(ref p, c + lane);
                path = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref o, c + lane), tHere, path);
            }

            sumOfPath += path;
        }

        return sumOfPath;
    }

    /// <summary>Two children need one exponential: that of minus their distance.</summary>
    private Vector512<double> UpPair(int n)
    {
        var lanes = (nuint)strip.Lanes;
        ref var largest = ref strip.Largest;
        ref var sum = ref strip.Sum;
        var (c0, c1) = (places[n][0], places[n][1]);
        ref var value = ref strip.Value(0);
        ref var t = ref strip.LogConditional(0);
        ref var p = ref strip.Conditional(0);
        var scale = Vector512.Create(InnerScale(n));
        for (nuint lane = 0; lane < lanes; lane += Tile)
        {
            var w0 = Vector512.LoadUnsafe(ref value, c0 + lane);
            var w1 = Vector512.LoadUnsafe(ref value, c1 + lane);
            var distance = (w0 - w1) * scale;
            Vector512.MaxNative(w0, w1).StoreUnsafe(ref largest, lane);
            distance.StoreUnsafe(ref t, c0 + lane);
            var below = -Vector512.Abs(distance);
            if (WideElementary.IsSupported)
            {
                var power = WideElementary.Exp(below);
                power.StoreUnsafe(ref p, c1 + lane);
                (Vector512<double>.One + power).StoreUnsafe(ref sum, lane);
            }
            else
            {
                below.StoreUnsafe(ref t, c1 + lane);
            }
        }

        if (!WideElementary.IsSupported)
        {
            VectorFunctions.Exp(ref Unsafe.Add(ref t, c1), ref Unsafe.Add(ref p, c1), lanes);
            for (nuint lane = 0; lane < lanes; lane += Tile)
                (Vector512<double>.One + Vector512.LoadUnsafe(ref p, c1 + lane)).StoreUnsafe(ref sum, lane);
        }

        ref var log = ref strip.LogOfSum;
        VectorFunctions.Log(ref sum, ref log, lanes);

        var sumOfPath = Vector512<double>.Zero;
        var isInner = n != plan.Root;
        ref var o = ref strip.OnPath(0);
        ref var oOfNode = ref strip.OnPath(plan.J + n);
        ref var tilt = ref strip.Tilt(n);
        for (nuint lane = 0; lane < lanes; lane += Tile)
        {
            var logHere = Vector512.LoadUnsafe(ref log, lane);
            var larger = Vector512<double>.One / Vector512.LoadUnsafe(ref sum, lane);
            var smaller = Vector512.LoadUnsafe(ref p, c1 + lane) * larger;
            var distance = Vector512.LoadUnsafe(ref t, c0 + lane);
            var isFirstLarger = Vector512.GreaterThanOrEqual(distance, Vector512<double>.Zero);
            var p0 = Vector512.ConditionalSelect(isFirstLarger, larger, smaller);
            var p1 = Vector512.ConditionalSelect(isFirstLarger, smaller, larger);
            var t0 = Vector512.MinNative(distance, Vector512<double>.Zero) - logHere;
            var t1 = Vector512.MinNative(-distance, Vector512<double>.Zero) - logHere;
            var o0 = Vector512.LoadUnsafe(ref o, c0 + lane);
            var o1 = Vector512.LoadUnsafe(ref o, c1 + lane);
            t0.StoreUnsafe(ref t, c0 + lane);
            t1.StoreUnsafe(ref t, c1 + lane);
            p0.StoreUnsafe(ref p, c0 + lane);
            p1.StoreUnsafe(ref p, c1 + lane);
            (-Vector512.FusedMultiplyAdd(p0, t0, p1 * t1)).StoreUnsafe(ref tilt, lane);
            if (isInner) (o0 + o1).StoreUnsafe(ref oOfNode, lane);
            sumOfPath += Vector512.FusedMultiplyAdd(o0, t0, o1 * t1);
        }

        return sumOfPath;
    }

    /// <summary>W of the node; in the unscaled form its tilt is the log-sum and not the entropy.</summary>
    private void SetValue(int n)
    {
        var l = Vector512.Create(strip.Dissimilarity[n]);
        ref var largest = ref strip.Largest;
        ref var log = ref strip.LogOfSum;
        ref var value = ref strip.Value(plan.J + n);
        if (plan.IsScaled)
        {
            for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
                Vector512.FusedMultiplyAdd(l, Vector512.LoadUnsafe(ref log, lane), Vector512.LoadUnsafe(ref largest, lane)).StoreUnsafe(ref value, lane);
            return;
        }

        ref var tilt = ref strip.Tilt(n);
        for (nuint lane = 0; lane < (nuint)strip.Lanes; lane += Tile)
        {
            var logSum = Vector512.LoadUnsafe(ref largest, lane) + Vector512.LoadUnsafe(ref log, lane);
            logSum.StoreUnsafe(ref tilt, lane);
            (l * logSum).StoreUnsafe(ref value, lane);
        }
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
}
