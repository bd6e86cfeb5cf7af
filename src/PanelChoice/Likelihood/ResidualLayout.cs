using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// The space in which residuals stand: the J utilities, then the dissimilarities of the D inner nodes in which they are free. Two nodes that share
/// a parameter are two coordinates.
/// </summary>
internal sealed class ResidualLayout
{
    private const int Tile = ChoiceDesign.TileLanes;

    /// <summary>The space of a design.</summary>
    public ResidualLayout(ChoiceDesign design)
    {
        Design = design;
        var layout = design.Layout;
        J = design.Alternatives;
        K = layout.Free.Length;
        FreeIndex = new int[layout.Count];
        Array.Fill(FreeIndex, -1);
        for (var k = 0; k < K; k++) FreeIndex[layout.Free[k]] = k;
        Nodes = [.. Enumerable.Range(0, design.Tree.Nodes.Length).Where(n => layout.NodeParameter[n] is >= 0 and var p && FreeIndex[p] >= 0)];
        ParameterOf = [.. Nodes.Select(n => FreeIndex[layout.NodeParameter[n]])];
        Stride = (Size + Tile - 1) / Tile * Tile;
    }

    /// <summary>The design.</summary>
    public ChoiceDesign Design { get; }

    /// <summary>Number of alternatives.</summary>
    public int J { get; }

    /// <summary>Number of free parameters.</summary>
    public int K { get; }

    /// <summary>The D nodes.</summary>
    public int[] Nodes { get; }

    /// <summary>For each of them its parameter, numbered among the free ones.</summary>
    public int[] ParameterOf { get; }

    /// <summary>For each parameter its number among the free ones; -1 for a fixed one.</summary>
    public int[] FreeIndex { get; }

    /// <summary>J + D.</summary>
    public int Size => J + Nodes.Length;

    /// <summary>J + D rounded up to a multiple of 8: the distance between rows, which end in zeros.</summary>
    public int Stride { get; }

    /// <summary>The parameters as the node's l; 1 for the root.</summary>
    public double[] Dissimilarities(ReadOnlySpan<double> parameters)
    {
        var l = new double[Design.Tree.Nodes.Length];
        for (var n = 0; n < l.Length; n++) l[n] = Design.Layout.NodeParameter[n] is >= 0 and var p ? parameters[p] : 1;
        return l;
    }
}
