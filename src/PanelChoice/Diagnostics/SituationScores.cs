using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// The scores of one situation in the space (V, l): every derivative of log P for the observed choice and for each hypothetical choice i,
/// enumerated, so that conditional expectations given the past are exact on a tree of any depth and in both forms.
/// <code>
/// g^i = d log P(i) / dV (J)      f^i = (g^i, d log P(i) / dl) (J + D)      s^i = Z' f^i (K)      Z = blockdiag(X, who owns which l)
/// Omega = sum_i P_i f^i f^i'     E = sum_i P_i g^i s^i' = Cov(g, s)        I = sum_i P_i s^i s^i' = Z' Omega Z
/// </code>
/// D counts the inner nodes whose dissimilarity is free, K the free parameters. With a basis B the scores are B s instead, so that in the
/// basis that whitens the total information every A_ss^-1 of the battery's formulas is the identity.
/// One instance is a work space: it is not for use by several threads at once.
/// </summary>
internal sealed class SituationScores
{
    private readonly ChoiceDesign design;
    private readonly BlockReader reader;
    private readonly TreeProbabilities tree;
    private readonly double[] parameters;
    private readonly double[]? basis;
    private readonly int[] freeIndex;
    private readonly int[] freeNodes;
    private readonly int phi;
    private readonly double[] utility;
    private readonly bool[] offered;
    private readonly double[] byValue;
    private readonly double[] byDissimilarity;
    private readonly double[] full;
    private readonly double[] z;
    private readonly double[] raw;
    private readonly double[] product;
    private int chosen;

    /// <summary>A work space.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">The form.</param>
    /// <param name="parameters">All parameters, free and fixed.</param>
    /// <param name="basis">K x K matrix B over the free parameters, row by row; null for the scores themselves.</param>
    public SituationScores(ChoiceDesign design, NestedLogitForm form, ReadOnlySpan<double> parameters, double[]? basis)
    {
        this.design = design;
        reader = design.Store.Reader();
        this.parameters = parameters.ToArray();
        this.basis = basis;
        tree = new TreeProbabilities(design.Tree, form);
        J = design.Alternatives;
        K = design.Layout.Free.Length;
        var nodes = design.Tree.Nodes.Length;
        var l = new double[nodes];
        for (var n = 0; n < nodes; n++) l[n] = design.Layout.NodeParameter[n] is var p && p >= 0 ? parameters[p] : 1;
        tree.SetDissimilarities(l);

        freeIndex = new int[design.Layout.Count];
        Array.Fill(freeIndex, -1);
        for (var k = 0; k < K; k++) freeIndex[design.Layout.Free[k]] = k;
        freeNodes = [.. Enumerable.Range(0, nodes).Where(n => design.Layout.NodeParameter[n] is var p && p >= 0 && freeIndex[p] >= 0)];
        phi = J + freeNodes.Length;

        utility = new double[J];
        offered = new bool[J];
        byValue = new double[J + nodes];
        byDissimilarity = new double[nodes];
        full = new double[phi];
        raw = new double[K];
        z = new double[phi * K];
        product = new double[phi * K];
        Omega = new double[phi * phi];
        Probability = new double[J];
        Residual = new double[J];
        Score = new double[K];
        Cross = new double[J * K];
    }

    /// <summary>Number of alternatives.</summary>
    public int J { get; }

    /// <summary>Number of free parameters.</summary>
    public int K { get; }

    /// <summary>P_i; 0 where not offered.</summary>
    public double[] Probability { get; }

    /// <summary>Generalised residual g of the observed choice (J).</summary>
    public double[] Residual { get; }

    /// <summary>Score s of the observed choice (K), in the basis.</summary>
    public double[] Score { get; }

    /// <summary>Omega, (J + D) x (J + D); <see cref="OmegaAt"/> reads its J x J part, Cov(g, g).</summary>
    private double[] Omega { get; }

    /// <summary>E = Cov(g, s), J x K row by row, in the basis.</summary>
    public double[] Cross { get; }

    /// <summary>Cov(g_j, g_k).</summary>
    public double OmegaAt(int j, int k) => Omega[(j * phi) + k];

    /// <summary>Receives Cov(g, g) z.</summary>
    public void ApplyOmega(ReadOnlySpan<double> vector, Span<double> result)
    {
        for (var j = 0; j < J; j++)
        {
            var sum = 0.0;
            for (var k = 0; k < J; k++) sum += Omega[(j * phi) + k] * vector[k];
            result[j] = sum;
        }
    }

    /// <summary>Computes everything for a situation.</summary>
    public void Load(int situation)
    {
        LoadDesign(situation);
        tree.Compute(utility, offered);
        Array.Clear(Omega);
        for (var i = 0; i < J; i++)
        {
            Probability[i] = offered[i] ? tree.Probability[i] : 0;
            if (offered[i] && Probability[i] > 0) AddHypothetical(i, Probability[i]);
        }

        for (var r = 0; r < phi; r++)
            for (var c = 0; c < r; c++) Omega[(r * phi) + c] = Omega[(c * phi) + r];

        Derivatives(chosen);
        Array.Copy(full, Residual, J);
        Array.Clear(Score);
        for (var r = 0; r < phi; r++) Accumulate(full[r], z.AsSpan(r * K, K), Score);

        Array.Clear(product);
        for (var r = 0; r < phi; r++)
            for (var c = 0; c < phi; c++) Accumulate(Omega[(r * phi) + c], z.AsSpan(c * K, K), product.AsSpan(r * K, K));
        Array.Copy(product, Cross, J * K);
    }

    /// <summary>Adds I, the expected information of the loaded situation (K x K), in the basis.</summary>
    public void AddInformation(Span<double> information)
    {
        for (var r = 0; r < phi; r++)
            for (var k = 0; k < K; k++) Accumulate(z[(r * K) + k], product.AsSpan(r * K, K), information.Slice(k * K, K));
    }

    /// <summary>Receives f^i and s^i of a hypothetical choice of the loaded situation; for checks.</summary>
    internal void Hypothetical(int choice, Span<double> residual, Span<double> score)
    {
        Derivatives(choice);
        full.AsSpan(0, J).CopyTo(residual);
        score.Clear();
        for (var r = 0; r < phi; r++) Accumulate(full[r], z.AsSpan(r * K, K), score);
    }

    private void LoadDesign(int situation)
    {
        if (reader.Block is not { } block || situation < block.FirstSituation || situation >= block.FirstSituation + block.Situations)
        {
            block = design.Blocks[design.BlockOf[situation]];
            reader.Open(block);
        }

        var lane = situation - block.FirstSituation;
        chosen = reader.ChosenAt(lane);
        for (var j = 0; j < J; j++)
        {
            offered[j] = reader.IsOffered(lane, j);
            utility[j] = 0;
        }

        Array.Clear(z);
        foreach (var column in design.Columns)
        {
            if (!offered[column.Alternative]) continue;
            var x = reader.Value(column.Storage, lane);
            utility[column.Alternative] += parameters[column.Parameter] * x;
            if (freeIndex[column.Parameter] is var k && k >= 0) z[(column.Alternative * K) + k] = x;
        }

        for (var d = 0; d < freeNodes.Length; d++)
            z[((J + d) * K) + freeIndex[design.Layout.NodeParameter[freeNodes[d]]]] = 1;
        if (basis is null) return;
        for (var r = 0; r < phi; r++)
        {
            var row = z.AsSpan(r * K, K);
            row.CopyTo(raw);
            row.Clear();
            for (var q = 0; q < K; q++)
                if (raw[q] != 0)
                    for (var k = 0; k < K; k++) row[k] += basis[(k * K) + q] * raw[q];
        }
    }

    private void Derivatives(int choice)
    {
        tree.Gradient(choice, byValue, byDissimilarity);
        byValue.AsSpan(0, J).CopyTo(full);
        for (var d = 0; d < freeNodes.Length; d++) full[J + d] = byDissimilarity[freeNodes[d]];
    }

    private void AddHypothetical(int choice, double probability)
    {
        Derivatives(choice);
        for (var r = 0; r < phi; r++)
        {
            var f = probability * full[r];
            if (f == 0) continue;
            for (var c = r; c < phi; c++) Omega[(r * phi) + c] += f * full[c];
        }
    }

    private static void Accumulate(double factor, ReadOnlySpan<double> from, Span<double> to)
    {
        if (factor == 0) return;
        for (var k = 0; k < to.Length; k++) to[k] += factor * from[k];
    }
}
