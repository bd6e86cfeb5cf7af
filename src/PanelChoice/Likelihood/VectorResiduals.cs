using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// Residuals from the rows that the vector kernel leaves on its way up the tree (values, powers and what each node makes of them), eight situations at a time: one way down the
/// tree for each hypothetical choice i. With the letters of <see cref="StripProbabilities"/>, o^i_c being 1 where c lies on the path to i, else 0,
/// <code>
/// a^i_c = s o^i_c + f^i_m p_c        f^i_m = a^i_m - o^i_m / l_m | l_m a^i_m - o^i_m,  at the root -1
/// d log P(i) / dl_m = f^i_m E_m - o^i_m t^i_m / l_m  (utility-scaled, t^i_m of the child on the path)  |  a^i_m L_m  (unscaled)
/// </code>
/// Enumeration costs J (J + D)^2 / 2 multiplications, which is less than what is done with the covariates afterwards.
/// </summary>
internal sealed class VectorResiduals : SituationResiduals
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly Strip strip;
    private readonly StripProbabilities probabilities;

    /// <summary>For each alternative and inner node the child of the node on the path to the alternative; -1 where the node is not on it.</summary>
    private readonly int[][] pathChild;

    /// <summary>For each inner node its coordinate; -1 where it has none.</summary>
    private readonly int[] coordinate;
    private readonly Vector512<double>[] share;
    private readonly Vector512<double>[] slope;
    private readonly Vector512<double>[] hypothetical;
    private readonly Vector512<double>[] observed;
    private readonly Vector512<double>[] covariance;
    private readonly Vector512<double>[] covariates;
    private int openTile;

    /// <summary>A work space.</summary>
    /// <param name="layout">The space.</param>
    /// <param name="plan">The kernel's plan for the same design.</param>
    /// <param name="parameters">All parameters, free and fixed.</param>
    public VectorResiduals(ResidualLayout layout, StripPlan plan, ReadOnlySpan<double> parameters)
        : base(layout)
    {
        this.plan = plan;
        strip = new Strip(plan) { KeepsAll = true };
        probabilities = new StripProbabilities(plan, strip);
        strip.Begin(parameters);
        coordinate = [.. Enumerable.Range(0, plan.Nodes).Select(n => Array.IndexOf(layout.Nodes, n) is >= 0 and var d ? layout.J + d : -1)];
        pathChild = [.. Enumerable.Range(0, plan.J).Select(PathTo)];
        share = new Vector512<double>[plan.J + plan.Nodes];
        slope = new Vector512<double>[plan.J + plan.Nodes];
        hypothetical = new Vector512<double>[layout.Size];
        observed = new Vector512<double>[layout.Size];
        covariance = new Vector512<double>[layout.Size * (layout.Size + 1) / 2];
        covariates = new Vector512<double>[Covariates.Length];
    }

    public override double UnitsOf(int parameter) => plan.Units[parameter];

    public override int Open(DesignBlock block, int first)
    {
        strip.OpenNext(block, first, block.Lanes, LaneWeights.One(0, int.MaxValue));
        strip.Columns.Unfold();
        probabilities.Up();
        openTile = -1;
        return Math.Min(strip.Lanes, block.Situations - first);
    }

    public override void Read(int place)
    {
        if (place / Tile != openTile) OpenTile(place / Tile);
        var lane = place % Tile;
        for (var j = 0; j < plan.J; j++) Probability[j] = At(share, j, lane);
        for (var r = 0; r < observed.Length; r++) Residual[r] = At(observed, r, lane);
        for (var i = 0; i < covariates.Length; i++) Covariates[i] = At(covariates, i, lane);
        var (size, stride) = (Layout.Size, Layout.Stride);
        for (int r = 0, at = 0; r < size; r++)
            for (var c = r; c < size; c++, at++)
                Covariance[(r * stride) + c] = Covariance[(c * stride) + r] = At(covariance, at, lane);
    }

    private static double At(Vector512<double>[] rows, int row, int lane) =>
        Unsafe.Add(ref Unsafe.As<Vector512<double>, double>(ref rows[row]), lane);

    private int[] PathTo(int alternative)
    {
        int[] path = [.. Enumerable.Repeat(-1, plan.Nodes)];
        for (var c = alternative; plan.Parent[c] >= 0; c = plan.J + plan.Parent[c]) path[plan.Parent[c]] = c;
        return path;
    }

    private void OpenTile(int tile)
    {
        openTile = tile;
        var lane = (nuint)(tile * Tile);
        var columns = plan.Design.Columns;
        for (var i = 0; i < covariates.Length; i++)
            covariates[i] = columns[i].Storage < 0 ? Vector512<double>.One : Vector512.LoadUnsafe(ref strip.Columns.Column(columns[i].Storage), lane);

        share[plan.J + plan.Root] = Vector512<double>.One;
        for (var n = plan.Root; n >= 0; n--)
            foreach (var c in plan.Children[n]) share[c] = share[plan.J + n] * Conditional(n, c, lane);

        Array.Clear(covariance);
        Array.Clear(observed);
        ref var chosen = ref strip.Columns.Chosen(0);
        for (var i = 0; i < plan.J; i++)
        {
            SetHypothetical(i, lane);
            var isChosen = TileMask.Lanes(Unsafe.Add(ref chosen, (tile * plan.J) + i));
            var size = hypothetical.Length;
            for (int r = 0, at = 0; r < size; r++)
            {
                observed[r] = Vector512.ConditionalSelect(isChosen, hypothetical[r], observed[r]);
                var weighted = share[i] * hypothetical[r];
                for (var c = r; c < size; c++, at++) covariance[at] = Vector512.FusedMultiplyAdd(weighted, hypothetical[c], covariance[at]);
            }
        }
    }

    /// <summary>p of a node's child.</summary>
    private Vector512<double> Conditional(int n, int c, nuint lane) =>
        Vector512.LoadUnsafe(ref strip.Power(c), lane) * Vector512.LoadUnsafe(ref strip.Inverse(n), lane);

    /// <summary>t = log p of a node's child (utility-scaled form).</summary>
    private Vector512<double> LogConditional(int n, int c, nuint lane) =>
        ((Vector512.LoadUnsafe(ref strip.Value(c), lane) - Vector512.LoadUnsafe(ref strip.Largest(n), lane)) * strip.Scale(n))
        - Vector512.LoadUnsafe(ref strip.Mean(n), lane) - Vector512.LoadUnsafe(ref strip.Tilt(n), lane);

    /// <summary>f^i of eight situations.</summary>
    private void SetHypothetical(int i, nuint lane)
    {
        var path = pathChild[i];
        for (var n = plan.Root; n >= 0; n--)
        {
            var isRoot = n == plan.Root;
            var l = strip.Dissimilarity[n];
            var own = slope[plan.J + n];
            var isOnPath = path[n] >= 0;
            var scale = plan.IsScaled ? 1 / l : 1;
            var flow = isRoot ? Vector512.Create(-1.0) : plan.IsScaled ? own : own * l;
            if (!isRoot && isOnPath) flow -= Vector512.Create(scale);
            if (coordinate[n] is >= 0 and var r)
            {
                var tilt = Vector512.LoadUnsafe(ref strip.Tilt(n), lane);
                hypothetical[r] = !plan.IsScaled ? own * tilt
                    : isOnPath ? (flow * tilt) - (LogConditional(n, path[n], lane) * scale)
                    : flow * tilt;
            }

            foreach (var c in plan.Children[n])
            {
                var down = flow * Conditional(n, c, lane);
                slope[c] = path[n] == c ? down + Vector512.Create(scale) : down;
            }
        }

        for (var j = 0; j < plan.J; j++) hypothetical[j] = slope[j];
    }
}
