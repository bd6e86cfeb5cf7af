using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// A strip is a block, or a run of tiles of a long one, short enough that everything about it stays in a core's cache. This is its memory, and the
/// step that opens it: weights and columns. Child numbers are those of <see cref="Study.NestTree"/>. Few rows are kept: what a later step can work
/// out again from a row or two costs less so than being written and read. One instance is a work space: it is not for use by several threads at once.
/// </summary>
internal sealed class Strip
{
    /// <summary>
    /// Value of whatever is not offered: far below any utility, so that its probability is exactly 0 next to an offered sibling, yet finite
    /// when squared. Where nothing is offered (padding, weight 0) siblings share it and every figure stays finite.
    /// </summary>
    public const double NotOffered = -1e100;

    private const int Tile = ChoiceDesign.TileLanes;
    private const int RowsOfNode = 8;
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

    /// <summary>Its columns and masks.</summary>
    public StripColumns Columns { get; }

    /// <summary>
    /// Whether each node has all its rows. Value and gradient need some of them for the node at work only: nodes then share those, so that more of
    /// the strip stays in the first-level cache.
    /// </summary>
    public bool KeepsAll { get; set; }

    /// <summary>W of a child; V for an alternative.</summary>
    public ref double Value(int child) => ref rows.Row(child);

    /// <summary>e = exp((W_c - max) s) of a child: p = e / sum.</summary>
    public ref double Power(int child) => ref rows.Row(Children + child);

    /// <summary>o of a node: the situation's weight where the chosen alternative lies below it, else 0.</summary>
    public ref double OnPath(int node) => ref OfNode(node, 0);

    /// <summary>The situations' weights: o of the root.</summary>
    public ref double Weight => ref OnPath(plan.Root);

    /// <summary>1 / sum of e over a node's children. Where not all is kept, <see cref="FlowOverSum"/> takes its place.</summary>
    public ref double Inverse(int node) => ref OfNode(node, 1);

    /// <summary>D = d W / d l of a node for given values of its children: entropy E (utility-scaled), log-sum L (unscaled).</summary>
    public ref double Tilt(int node) => ref OfNode(node, 2);

    /// <summary>f: what a node hands on to each child, times the child's p.</summary>
    public ref double Flow(int node) => ref OfNode(node, 3);

    /// <summary>g = f / sum: what a node hands on to each child, times the child's e.</summary>
    public ref double FlowOverSum(int node) => ref OfNode(node, KeepsAll ? 4 : 1);

    /// <summary>The largest value among a node's children; not kept for all nodes unless <see cref="KeepsAll"/>.</summary>
    public ref double Largest(int node) => ref OfNode(KeepsAll ? node : 0, 5);

    /// <summary>Sum of o_c t_c over a node's children; not kept for all nodes unless <see cref="KeepsAll"/>.</summary>
    public ref double Path(int node) => ref OfNode(KeepsAll ? node : 0, 6);

    /// <summary>Mean of (W_c - max) s over a node's children, each with its p; the distance of (W_c - max) s from it is t_c + E. Not kept for all nodes unless <see cref="KeepsAll"/>.</summary>
    public ref double Mean(int node) => ref OfNode(KeepsAll ? node : 0, 7);

    /// <summary>For the node at work: the sum of its children's e.</summary>
    public ref double Sum => ref rows.Row((2 * Children) + (RowsOfNode * plan.Nodes));

    /// <summary>For the node at work: the sum of e (W_c - max) s over its children.</summary>
    public ref double Moment => ref rows.Row((2 * Children) + (RowsOfNode * plan.Nodes) + 1);

    private int Children => plan.J + plan.Nodes;

    /// <summary>Rows that a strip needs for J alternatives and the given number of inner nodes.</summary>
    public static int RowCount(int alternatives, int nodes) => (2 * (alternatives + nodes)) + (RowsOfNode * nodes) + 2;

    /// <summary>s of a node's children.</summary>
    public double Scale(int node) => plan.IsScaled ? 1 / Dissimilarity[node] : 1;

    /// <summary>Takes over parameters.</summary>
    public void Begin(ReadOnlySpan<double> parameters)
    {
        for (var k = 0; k < plan.K; k++) Theta[k] = parameters[k] / plan.Units[k];
        for (var n = 0; n < plan.Nodes; n++) Dissimilarity[n] = plan.NodeParameter[n] is var q && q >= 0 ? Theta[q] : 1;
    }

    /// <summary>Opens the next strip of the lanes up to an end, cut so that the strips are of about equal length.</summary>
    /// <param name="block">The block.</param>
    /// <param name="lane">First lane, a multiple of 8.</param>
    /// <param name="end">Lane after the last, a multiple of 8.</param>
    /// <param name="weights">Gives the lanes their weights.</param>
    /// <returns>False where every lane has weight 0; then nothing else is opened.</returns>
    public bool OpenNext(DesignBlock block, int lane, int end, in LaneWeights weights)
    {
        var strips = (end - lane + plan.StripLanes - 1) / plan.StripLanes;
        Lanes = ((end - lane) / Tile + strips - 1) / strips * Tile;
        var weight = rows.Lanes((2 * Children) + plan.Root, Lanes);
        weights.Fill(plan.Design, block.FirstSituation + lane, block.FirstSituation + block.Situations, weight);
        if (!weight.ContainsAnyExcept(0.0)) return false;
        Columns.Open(block, lane, weight);
        return true;
    }

    private ref double OfNode(int node, int kind) => ref rows.Row((2 * Children) + (kind * plan.Nodes) + node);
}
