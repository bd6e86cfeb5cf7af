using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// A strip is a block, or a run of tiles of a long one, short enough that everything about it stays in a core's cache. This is its memory,
/// and the step that fills it from the design: weights, utilities, choices. Child numbers are those of <see cref="Study.NestTree"/>.
/// One instance is a work space: it is not for use by several threads at once.
/// </summary>
internal sealed class Strip
{
    /// <summary>
    /// Value of whatever is not offered: far below any utility, so that its probability is exactly 0 next to an offered sibling, yet finite
    /// when squared. Where nothing is offered (padding, weight 0) siblings share it and every figure stays finite.
    /// </summary>
    public const double NotOffered = -1e100;

    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly StripRows rows;

    /// <summary>A work space for the plan's design.</summary>
    public Strip(StripPlan plan)
    {
        this.plan = plan;
        rows = new StripRows(RowCount(plan.J, plan.Nodes), plan.StripLanes);
        Columns = new StripColumns(plan);
        Theta = new double[plan.K];
        Dissimilarity = new double[plan.Nodes];
    }

    /// <summary>Distance between the rows of two child numbers that follow each other.</summary>
    public int Stride => rows.Stride;

    /// <summary>The parameters, coefficients in the units in which columns are held.</summary>
    public double[] Theta { get; }

    /// <summary>l of each node; 1 for the root.</summary>
    public double[] Dissimilarity { get; }

    /// <summary>Lanes of the strip, a multiple of 8.</summary>
    public int Lanes { get; private set; }

    private int Children => plan.J + plan.Nodes;

    /// <summary>Rows that a strip needs for J alternatives and the given number of inner nodes.</summary>
    public static int RowCount(int alternatives, int nodes) => (5 * (alternatives + nodes)) + (2 * nodes) + 3;

    /// <summary>W of a child; V for an alternative.</summary>
    public ref double Value(int child) => ref rows.Row(child);

    /// <summary>t = log p of a child inside its node.</summary>
    public ref double LogConditional(int child) => ref rows.Row(Children + child);

    /// <summary>p of a child inside its node.</summary>
    public ref double Conditional(int child) => ref rows.Row((2 * Children) + child);

    /// <summary>o: the situation's weight where the child lies on the path to the chosen alternative, else 0. The root's row is the weight.</summary>
    public ref double OnPath(int child) => ref rows.Row((3 * Children) + child);

    /// <summary>a: weight times d log P / d W of a child.</summary>
    public ref double Slope(int child) => ref rows.Row((4 * Children) + child);

    /// <summary>f: what a node hands on to each child, times the child's p.</summary>
    public ref double Flow(int node) => ref rows.Row((5 * Children) + node);

    /// <summary>D = d W / d l of a node for given values of its children: entropy E (utility-scaled), log-sum L (unscaled).</summary>
    public ref double Tilt(int node) => ref rows.Row((5 * Children) + plan.Nodes + node);

    /// <summary>For the node at work: the largest value among its children.</summary>
    public ref double Largest => ref rows.Row((5 * Children) + (2 * plan.Nodes));

    /// <summary>For the node at work: the sum of its children's exponentials.</summary>
    public ref double Sum => ref rows.Row((5 * Children) + (2 * plan.Nodes) + 1);

    /// <summary>For the node at work: the logarithm of that sum.</summary>
    public ref double LogOfSum => ref rows.Row((5 * Children) + (2 * plan.Nodes) + 2);

    /// <summary>Its columns.</summary>
    public StripColumns Columns { get; }

    /// <summary>Takes over parameters.</summary>
    public void Begin(ReadOnlySpan<double> parameters)
    {
        for (var k = 0; k < plan.K; k++) Theta[k] = parameters[k] / plan.Units[k];
        for (var n = 0; n < plan.Nodes; n++) Dissimilarity[n] = plan.NodeParameter[n] is var q && q >= 0 ? Theta[q] : 1;
    }

    /// <summary>Loads the next strip of the lanes up to an end, cut so that the strips are of about equal length.</summary>
    /// <param name="block">The block.</param>
    /// <param name="lane">First lane, a multiple of 8.</param>
    /// <param name="end">Lane after the last, a multiple of 8.</param>
    /// <param name="weights">Gives the lanes their weights.</param>
    /// <returns>False where every lane has weight 0; then nothing else is loaded.</returns>
    public bool LoadNext(DesignBlock block, int lane, int end, in LaneWeights weights)
    {
        var strips = (end - lane + plan.StripLanes - 1) / plan.StripLanes;
        var tiles = ((end - lane) / Tile + strips - 1) / strips;
        return Load(block, lane, tiles * Tile, weights);
    }

    /// <summary>Loads a strip; false where every lane has weight 0. Lanes with weight 0 count as if nothing were offered.</summary>
    private bool Load(DesignBlock block, int firstLane, int lanes, in LaneWeights weights)
    {
        Lanes = lanes;
        var weight = rows.Lanes(RootOnPath, lanes);
        weights.Fill(plan.Design, block.FirstSituation + firstLane, block.FirstSituation + block.Situations, weight);
        if (!weight.ContainsAnyExcept(0.0)) return false;
        Columns.Open(block, firstLane, lanes);
        for (var j = 0; j < plan.J; j++)
        {
            Columns.Prepare(plan.Leaves[j]);
            SumUtility(j);
        }

        ApplyMasks();
        return true;
    }

    private int RootOnPath => (3 * Children) + plan.J + plan.Root;

    /// <summary>V = sum of coefficient times covariate, four columns at a time.</summary>
    private void SumUtility(int alternative)
    {
        var leaf = plan.Leaves[alternative];
        ref var value = ref Value(alternative);
        var constant = 0.0;
        foreach (var k in leaf.Constants) constant += Theta[k];
        MemoryMarshal.CreateSpan(ref value, Lanes).Fill(constant);

        var i = 0;
        for (; i + 4 <= leaf.Stored.Length; i += 4)
        {
            ref var x0 = ref Columns.Column(leaf.Places[i]);
            ref var x1 = ref Columns.Column(leaf.Places[i + 1]);
            ref var x2 = ref Columns.Column(leaf.Places[i + 2]);
            ref var x3 = ref Columns.Column(leaf.Places[i + 3]);
            var b0 = Vector512.Create(Theta[leaf.Stored[i]]);
            var b1 = Vector512.Create(Theta[leaf.Stored[i + 1]]);
            var b2 = Vector512.Create(Theta[leaf.Stored[i + 2]]);
            var b3 = Vector512.Create(Theta[leaf.Stored[i + 3]]);
            for (nuint lane = 0; lane < (nuint)Lanes; lane += Tile)
            {
                var left = Vector512.FusedMultiplyAdd(b0, Vector512.LoadUnsafe(ref x0, lane), Vector512.LoadUnsafe(ref value, lane));
                var right = b1 * Vector512.LoadUnsafe(ref x1, lane);
                left = Vector512.FusedMultiplyAdd(b2, Vector512.LoadUnsafe(ref x2, lane), left);
                right = Vector512.FusedMultiplyAdd(b3, Vector512.LoadUnsafe(ref x3, lane), right);
                (left + right).StoreUnsafe(ref value, lane);
            }
        }

        for (; i < leaf.Stored.Length; i++)
        {
            ref var x = ref Columns.Column(leaf.Places[i]);
            var b = Vector512.Create(Theta[leaf.Stored[i]]);
            for (nuint lane = 0; lane < (nuint)Lanes; lane += Tile)
                Vector512.FusedMultiplyAdd(b, Vector512.LoadUnsafe(ref x, lane), Vector512.LoadUnsafe(ref value, lane)).StoreUnsafe(ref value, lane);
        }
    }

    /// <summary>Values of what is not offered, and weights of what is chosen.</summary>
    private void ApplyMasks()
    {
        var J = plan.J;
        var stride = (nuint)Stride;
        var offered = Columns.OfferedMasks;
        var chosen = Columns.ChosenMasks;
        ref var weight = ref OnPath(J + plan.Root);
        ref var value = ref Value(0);
        ref var onPath = ref OnPath(0);
        var missing = Vector512.Create(NotOffered);
        for (nuint lane = 0; lane < (nuint)Lanes; lane += Tile)
        {
            var w = Vector512.LoadUnsafe(ref weight, lane);
            var live = ~Vector512.Equals(w, Vector512<double>.Zero).ExtractMostSignificantBits();
            var place = lane;
            for (var j = 0; j < J; j++, place += stride)
            {
                var v = Vector512.LoadUnsafe(ref value, place);
                Vector512.ConditionalSelect(TileMask.Lanes(offered[j] & live), v, missing).StoreUnsafe(ref value, place);
                Vector512.ConditionalSelect(TileMask.Lanes(chosen[j] & live), w, Vector512<double>.Zero).StoreUnsafe(ref onPath, place);
            }

            offered = offered[J..];
            chosen = chosen[J..];
        }
    }
}
