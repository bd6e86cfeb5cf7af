using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;
using PanelChoice.Numerics;

namespace PanelChoice.Likelihood;

/// <summary>
/// The tree recursion on a strip: values and powers from the alternatives up, flows from the root down. Node outside, tile of lanes inside: short
/// loops over rows that stay in the cache. The exponential of 512-bit machines is small enough to stand where its argument is made; the portable one
/// has loops of its own, without which its constants would not stay in registers. Letters as in <see cref="TreeProbabilities"/> and
/// <see cref="Strip"/>; s is 1/l_m (utility-scaled) or 1 (unscaled), o is the situation's weight on the path to the choice, else 0.
/// <code>
/// up     d_c = s (W_c - max)    e_c = exp d_c    W_m = max + l log sum | l (max + log sum)    E_m = log sum - (sum of e_c d_c) / sum
///        sum of o_c t_c = sum of o_c d_c - o_m log sum, which over all nodes adds up to log P
/// down   a_c = s o_c + g_m e_c    f_m = a_m - o_m / l_m | l_m a_m - o_m,  at the root -o    g_m = f_m / sum
/// </code>
/// </summary>
internal sealed class StripProbabilities
{
    private const int Tile = ChoiceDesign.TileLanes;

    private readonly StripPlan plan;
    private readonly Strip strip;
    private readonly Child[][] children;

    /// <summary>The recursion on a strip.</summary>
    public StripProbabilities(StripPlan plan, Strip strip)
    {
        this.plan = plan;
        this.strip = strip;
        children = [.. plan.Children.Select(c => c.Select(i => new Child(
            (nuint)(i * strip.Stride), i < plan.J, i < plan.J ? (nuint)i : (nuint)((i - plan.J) * strip.Stride))).ToArray())];
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

    /// <summary>Values and powers.</summary>
    public void Up()
    {
        StripUtilities.Set(plan, strip);
        for (var n = 0; n < plan.Nodes; n++)
        {
            if (plan.Children[n].Length == 2) UpPair(n);
            else UpMany(n);
            PathSum[n] = n == plan.Root ? CloseRoot() : Close(n);
        }
    }

    /// <summary>Weight times log P of each lane, from the rows that <see cref="Up"/> left.</summary>
    public void WriteLogProbabilities(Span<double> log)
    {
        log.Clear();
        for (var n = 0; n < plan.Nodes; n++)
            for (var lane = 0; lane < log.Length; lane++) log[lane] += Unsafe.Add(ref strip.Path(n), lane);
    }

    /// <summary>The flows of all nodes, from which the slope a_c of any child follows.</summary>
    public void Down()
    {
        for (var n = plan.Root; n >= 0; n--)
            foreach (var c in plan.Children[n])
                if (c >= plan.J) SetFlow(n, c - plan.J);
    }

    private void UpMany(int n)
    {
        if (!WideElementary.IsSupported) SetPowers(n);
        ReadOnlySpan<Child> below = children[n];
        var scale = Vector512.Create(strip.Scale(n));
        var isRoot = n == plan.Root;
        ref var value = ref strip.Value(0);
        ref var power = ref strip.Power(0);
        ref var weight = ref strip.Weight;
        ref var onPathBelow = ref strip.OnPath(0);
        ref var chosen = ref strip.Columns.Chosen(0);
        ref var sum = ref strip.Sum;
        ref var moment = ref strip.Moment;
        ref var largest = ref strip.Largest(n);
        ref var path = ref strip.Path(n);
        ref var onPath = ref strip.OnPath(n);
        var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
        nuint mask = 0;
        for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
        {
            var max = Vector512.LoadUnsafe(ref value, below[0].Row + lane);
            foreach (ref readonly var c in below) max = Vector512.MaxNative(max, Vector512.LoadUnsafe(ref value, c.Row + lane));
            var w = Vector512.LoadUnsafe(ref weight, lane);
            var (total, ofPowers, ofPath, o) = (Vector512<double>.Zero, Vector512<double>.Zero, Vector512<double>.Zero, Vector512<double>.Zero);
            foreach (ref readonly var c in below)
            {
                var d = (Vector512.LoadUnsafe(ref value, c.Row + lane) - max) * scale;
                var e = PowerOf(d, ref power, c.Row + lane);
                var here = c.IsAlternative
                    ? TileMask.Lanes(Unsafe.Add(ref chosen, c.Path + mask)) & w
                    : Vector512.LoadUnsafe(ref onPathBelow, c.Path + lane);
                total += e;
                ofPath = Vector512.FusedMultiplyAdd(here, d, ofPath);
                if (isRoot) continue;
                ofPowers = Vector512.FusedMultiplyAdd(e, d, ofPowers);
                o += here;
            }

            total.StoreUnsafe(ref sum, lane);
            ofPath.StoreUnsafe(ref path, lane);
            if (isRoot) continue;
            max.StoreUnsafe(ref largest, lane);
            ofPowers.StoreUnsafe(ref moment, lane);
            o.StoreUnsafe(ref onPath, lane);
        }
    }

    /// <summary>Two children need one exponential: that of minus their distance.</summary>
    private void UpPair(int n)
    {
        if (!WideElementary.IsSupported) SetPowerOfPair(n);
        var (c0, c1) = (children[n][0], children[n][1]);
        var scale = Vector512.Create(strip.Scale(n));
        ref var value = ref strip.Value(0);
        ref var power = ref strip.Power(0);
        ref var weight = ref strip.Weight;
        ref var onPathBelow = ref strip.OnPath(0);
        ref var chosen = ref strip.Columns.Chosen(0);
        ref var sum = ref strip.Sum;
        ref var moment = ref strip.Moment;
        ref var largest = ref strip.Largest(n);
        ref var path = ref strip.Path(n);
        ref var onPath = ref strip.OnPath(n);
        var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
        nuint mask = 0;
        for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
        {
            var w0 = Vector512.LoadUnsafe(ref value, c0.Row + lane);
            var w1 = Vector512.LoadUnsafe(ref value, c1.Row + lane);
            var w = Vector512.LoadUnsafe(ref weight, lane);
            var distance = (w0 - w1) * scale;
            var below = -Vector512.Abs(distance);
            var smaller = PowerOf(below, ref power, c1.Row + lane);
            var isFirstLarger = Vector512.GreaterThanOrEqual(distance, Vector512<double>.Zero);
            Vector512.ConditionalSelect(isFirstLarger, Vector512<double>.One, smaller).StoreUnsafe(ref power, c0.Row + lane);
            Vector512.ConditionalSelect(isFirstLarger, smaller, Vector512<double>.One).StoreUnsafe(ref power, c1.Row + lane);
            var o0 = c0.IsAlternative ? TileMask.Lanes(Unsafe.Add(ref chosen, c0.Path + mask)) & w : Vector512.LoadUnsafe(ref onPathBelow, c0.Path + lane);
            var o1 = c1.IsAlternative ? TileMask.Lanes(Unsafe.Add(ref chosen, c1.Path + mask)) & w : Vector512.LoadUnsafe(ref onPathBelow, c1.Path + lane);
            var d0 = Vector512.MinNative(distance, Vector512<double>.Zero);
            (Vector512<double>.One + smaller).StoreUnsafe(ref sum, lane);
            (smaller * below).StoreUnsafe(ref moment, lane);
            Vector512.MaxNative(w0, w1).StoreUnsafe(ref largest, lane);
            Vector512.FusedMultiplyAdd(o0, d0, o1 * (d0 - distance)).StoreUnsafe(ref path, lane);
            (o0 + o1).StoreUnsafe(ref onPath, lane);
        }
    }

    /// <summary>e^d: worked out here, or already standing in the row.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private static Vector512<double> PowerOf(Vector512<double> d, ref double power, nuint place)
    {
        if (!WideElementary.IsSupported) return Vector512.LoadUnsafe(ref power, place);
        var e = WideElementary.Exp(d);
        e.StoreUnsafe(ref power, place);
        return e;
    }

    private void SetPowers(int n)
    {
        ReadOnlySpan<Child> below = children[n];
        var scale = Vector512.Create(strip.Scale(n));
        ref var value = ref strip.Value(0);
        ref var power = ref strip.Power(0);
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var max = Vector512.LoadUnsafe(ref value, below[0].Row + lane);
            foreach (ref readonly var c in below) max = Vector512.MaxNative(max, Vector512.LoadUnsafe(ref value, c.Row + lane));
            foreach (ref readonly var c in below)
                ((Vector512.LoadUnsafe(ref value, c.Row + lane) - max) * scale).StoreUnsafe(ref power, c.Row + lane);
        }

        foreach (ref readonly var c in below) VectorFunctions.Exp(ref Unsafe.Add(ref power, c.Row), ref Unsafe.Add(ref power, c.Row), (nuint)strip.Lanes);
    }

    private void SetPowerOfPair(int n)
    {
        var (c0, c1) = (children[n][0], children[n][1]);
        var scale = Vector512.Create(strip.Scale(n));
        ref var value = ref strip.Value(0);
        ref var power = ref Unsafe.Add(ref strip.Power(0), c1.Row);
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
            (-Vector512.Abs((Vector512.LoadUnsafe(ref value, c0.Row + lane) - Vector512.LoadUnsafe(ref value, c1.Row + lane)) * scale)).StoreUnsafe(ref power, lane);
        VectorFunctions.Exp(ref power, ref power, (nuint)strip.Lanes);
    }

    /// <summary>What a node's sum makes of it: value, tilt, path. A sum is at least 1; where it is NaN, so is the sum of e d.</summary>
    private Vector512<double> Close(int n)
    {
        ref var sum = ref strip.Sum;
        ref var moment = ref strip.Moment;
        ref var largest = ref strip.Largest(n);
        ref var onPath = ref strip.OnPath(n);
        ref var path = ref strip.Path(n);
        ref var inverse = ref strip.Inverse(n);
        ref var mean = ref strip.Mean(n);
        ref var tilt = ref strip.Tilt(n);
        ref var value = ref strip.Value(plan.J + n);
        var l = Vector512.Create(strip.Dissimilarity[n]);
        var isScaled = plan.IsScaled;
        var pathSum = Vector512<double>.Zero;
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var s = Vector512.LoadUnsafe(ref sum, lane);
            var log = VectorElementary.LogOfNormal(s);
            var inverseHere = Vector512<double>.One / s;
            var meanHere = Vector512.LoadUnsafe(ref moment, lane) * inverseHere;
            var max = Vector512.LoadUnsafe(ref largest, lane);
            var pathHere = Vector512.LoadUnsafe(ref path, lane) - (Vector512.LoadUnsafe(ref onPath, lane) * log);
            inverseHere.StoreUnsafe(ref inverse, lane);
            meanHere.StoreUnsafe(ref mean, lane);
            pathHere.StoreUnsafe(ref path, lane);
            pathSum += pathHere;
            if (isScaled)
            {
                (log - meanHere).StoreUnsafe(ref tilt, lane);
                Vector512.FusedMultiplyAdd(l, log, max).StoreUnsafe(ref value, lane);
            }
            else
            {
                (max + log).StoreUnsafe(ref tilt, lane);
                (l * (max + log)).StoreUnsafe(ref value, lane);
            }
        }

        return pathSum;
    }

    /// <summary>The root has neither a dissimilarity nor a node above: what its flow needs, and its path.</summary>
    private Vector512<double> CloseRoot()
    {
        ref var sum = ref strip.Sum;
        ref var weight = ref strip.Weight;
        ref var path = ref strip.Path(plan.Root);
        ref var inverse = ref strip.Inverse(plan.Root);
        ref var flow = ref strip.Flow(plan.Root);
        ref var flowOverSum = ref strip.FlowOverSum(plan.Root);
        var pathSum = Vector512<double>.Zero;
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var s = Vector512.LoadUnsafe(ref sum, lane);
            var w = Vector512.LoadUnsafe(ref weight, lane);
            var inverseHere = Vector512<double>.One / s;
            var pathHere = Vector512.LoadUnsafe(ref path, lane) - (w * VectorElementary.LogOfNormal(s));
            inverseHere.StoreUnsafe(ref inverse, lane);
            pathHere.StoreUnsafe(ref path, lane);
            pathSum += pathHere;
            (-w).StoreUnsafe(ref flow, lane);
            (-w * inverseHere).StoreUnsafe(ref flowOverSum, lane);
        }

        return pathSum;
    }

    /// <summary>f and g of node m below node n.</summary>
    private void SetFlow(int n, int m)
    {
        var l = strip.Dissimilarity[m];
        var scale = Vector512.Create(strip.Scale(n));
        var ofSlope = Vector512.Create(plan.IsScaled ? 1 : l);
        var ofPath = Vector512.Create(plan.IsScaled ? -1 / l : -1);
        ref var above = ref strip.FlowOverSum(n);
        ref var power = ref strip.Power(plan.J + m);
        ref var onPath = ref strip.OnPath(m);
        ref var inverse = ref strip.Inverse(m);
        ref var flow = ref strip.Flow(m);
        ref var flowOverSum = ref strip.FlowOverSum(m);
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var o = Vector512.LoadUnsafe(ref onPath, lane);
            var a = Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref above, lane), Vector512.LoadUnsafe(ref power, lane), scale * o);
            var f = Vector512.FusedMultiplyAdd(ofPath, o, ofSlope * a);
            f.StoreUnsafe(ref flow, lane);
            (f * Vector512.LoadUnsafe(ref inverse, lane)).StoreUnsafe(ref flowOverSum, lane);
        }
    }

    /// <summary>A node's child as the loops need it.</summary>
    /// <param name="Row">Distance of its row from the first child number's.</param>
    /// <param name="IsAlternative">Whether it is an alternative.</param>
    /// <param name="Path">Distance of its choice mask, or of its row of o, from the first one.</param>
    private readonly record struct Child(nuint Row, bool IsAlternative, nuint Path);
}
