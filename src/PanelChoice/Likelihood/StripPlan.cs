using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Likelihood;

/// <summary>The columns of one alternative. Its stored columns follow each other in a block, but for those that the design passes over.</summary>
/// <param name="Places">The stored columns, ascending.</param>
/// <param name="Stored">Parameter of each stored column.</param>
/// <param name="Constants">Parameters whose covariate is the constant 1.</param>
/// <param name="Groups">The stored columns by how they are held.</param>
internal sealed record LeafColumns(int[] Places, int[] Stored, int[] Constants, ColumnGroup[] Groups);

/// <summary>
/// What the vector kernel works out once for a design: the tree and the columns as plain arrays, and how many situations make a strip.
/// Children are numbered as in <see cref="NestTree"/>.
/// </summary>
internal sealed class StripPlan
{
    /// <summary>
    /// Memory that the rows of one strip may take: they must stay in a core's second-level cache. Strips as long as a block were measured to be
    /// faster than shorter ones that fit the first-level cache, because a block's columns are then read in one forward stream.
    /// </summary>
    private const int StripBytes = 256 * 1024;

    /// <summary>Works out the plan.</summary>
    /// <exception cref="ArgumentException">The design's stored columns are not in the order that <see cref="ChoiceDesign"/> promises.</exception>
    public StripPlan(ChoiceDesign design, NestedLogitForm form)
    {
        Design = design;
        IsScaled = form == NestedLogitForm.UtilityScaled;
        J = design.Alternatives;
        K = design.Layout.Count;
        Children = [.. design.Tree.Nodes.Select(n => n.Children.ToArray())];
        NodeParameter = [.. design.Layout.NodeParameter];
        Parent = Enumerable.Repeat(-1, J + Nodes).ToArray();
        for (var n = 0; n < Nodes; n++)
            foreach (var c in Children[n]) Parent[c] = n;

        Leaves = [.. Enumerable.Range(0, J).Select(j => ColumnsOf(design, j))];
        Units = [.. Enumerable.Repeat(1.0, K)];
        foreach (var column in design.Columns)
            if (column.Storage >= 0) Units[column.Parameter] = design.Store.Format.Columns[column.Storage].Units;
        Support = new int[Nodes][];
        for (var n = 0; n < Nodes; n++) Support[n] = SupportOf(n);

        var rows = Strip.RowCount(J, Nodes);
        var lanes = StripBytes / (rows * sizeof(double)) / ChoiceDesign.TileLanes * ChoiceDesign.TileLanes;
        StripLanes = Math.Clamp(lanes, 8 * ChoiceDesign.TileLanes, 32 * ChoiceDesign.TileLanes);
    }

    /// <summary>The design.</summary>
    public ChoiceDesign Design { get; }

    /// <summary>Whether the form is the utility-scaled one.</summary>
    public bool IsScaled { get; }

    /// <summary>Number of alternatives.</summary>
    public int J { get; }

    /// <summary>Number of parameters.</summary>
    public int K { get; }

    /// <summary>Number of inner nodes.</summary>
    public int Nodes => Children.Length;

    /// <summary>Index of the root among the inner nodes.</summary>
    public int Root => Nodes - 1;

    /// <summary>Children of each inner node.</summary>
    public int[][] Children { get; }

    /// <summary>Inner node above each child number; -1 for the root.</summary>
    public int[] Parent { get; }

    /// <summary>Parameter of each inner node; -1 for the root.</summary>
    public int[] NodeParameter { get; }

    /// <summary>Columns of each alternative.</summary>
    public LeafColumns[] Leaves { get; }

    /// <summary>
    /// For each parameter how many units one of its covariates' own makes as its columns are held: 100 for hours held as hundredths of an hour.
    /// The kernel works in held units: its coefficient is the user's divided by this, and so are its derivatives afterwards.
    /// </summary>
    public double[] Units { get; }

    /// <summary>
    /// For each inner node the parameters, ascending, on which the values of its children depend: the coefficients of the alternatives below
    /// it and the dissimilarities of the nodes below it.
    /// </summary>
    public int[][] Support { get; }

    /// <summary>Most lanes in a strip.</summary>
    public int StripLanes { get; }

    private static LeafColumns ColumnsOf(ChoiceDesign design, int alternative)
    {
        var columns = design.Columns.Where(c => c.Alternative == alternative).ToList();
        var stored = columns.Where(c => c.Storage >= 0).ToList();
        for (var i = 1; i < stored.Count; i++)
            if (stored[i].Storage <= stored[i - 1].Storage)
                throw new ArgumentException("The stored columns of an alternative do not follow each other.", nameof(design));
        int[] places = [.. stored.Select(c => c.Storage)];
        int[] parameters = [.. stored.Select(c => c.Parameter)];
        return new LeafColumns(
            places, parameters, [.. columns.Where(c => c.Storage < 0).Select(c => c.Parameter)], ColumnGroup.Of(design.Store.Format, places, parameters));
    }

    private int[] SupportOf(int node)
    {
        var support = new SortedSet<int>();
        foreach (var c in Children[node])
        {
            if (c < J)
            {
                support.UnionWith(Leaves[c].Stored);
                support.UnionWith(Leaves[c].Constants);
            }
            else
            {
                support.UnionWith(Support[c - J]);
                if (NodeParameter[c - J] >= 0) support.Add(NodeParameter[c - J]);
            }
        }

        return [.. support];
    }
}
