using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Likelihood;

/// <summary>Residuals by plain scalar code, choice after choice, on <see cref="TreeProbabilities"/>: what the vector kernel's are checked against.</summary>
internal sealed class ScalarResiduals : SituationResiduals
{
    private readonly BlockReader reader;
    private readonly TreeProbabilities tree;
    private readonly double[] parameters;
    private readonly double[] utility;
    private readonly bool[] offered;
    private readonly double[] byValue;
    private readonly double[] byDissimilarity;
    private readonly double[] hypothetical;
    private int firstLane;

    /// <summary>A work space.</summary>
    /// <param name="layout">The space.</param>
    /// <param name="form">The form.</param>
    /// <param name="parameters">All parameters, free and fixed.</param>
    public ScalarResiduals(ResidualLayout layout, NestedLogitForm form, ReadOnlySpan<double> parameters)
        : base(layout)
    {
        this.parameters = parameters.ToArray();
        reader = layout.Design.Store.Reader();
        tree = new TreeProbabilities(layout.Design.Tree, form);
        tree.SetDissimilarities(layout.Dissimilarities(parameters));
        utility = new double[layout.J];
        offered = new bool[layout.J];
        byValue = new double[layout.J + layout.Design.Tree.Nodes.Length];
        byDissimilarity = new double[layout.Design.Tree.Nodes.Length];
        hypothetical = new double[layout.Size];
    }

    public override double UnitsOf(int parameter) => 1;

    public override int Open(DesignBlock block, int first)
    {
        reader.Open(block);
        firstLane = first;
        return block.Situations - first;
    }

    public override void Read(int place)
    {
        var lane = firstLane + place;
        LoadDesign(lane);
        tree.Compute(utility, offered);
        Array.Clear(Covariance);
        for (var i = 0; i < Layout.J; i++)
        {
            Probability[i] = offered[i] ? tree.Probability[i] : 0;
            if (Probability[i] > 0) AddHypothetical(i, Probability[i]);
        }

        for (var r = 0; r < Layout.Size; r++)
            for (var c = 0; c < r; c++) Covariance[(r * Layout.Stride) + c] = Covariance[(c * Layout.Stride) + r];
        Hypothetical(reader.ChosenAt(lane), Residual);
    }

    /// <summary>Receives f^i of a hypothetical choice of the situation read last.</summary>
    public void Hypothetical(int choice, Span<double> residual)
    {
        tree.Gradient(choice, byValue, byDissimilarity);
        byValue.AsSpan(0, Layout.J).CopyTo(residual);
        for (var d = 0; d < Layout.Nodes.Length; d++) residual[Layout.J + d] = byDissimilarity[Layout.Nodes[d]];
    }

    private void LoadDesign(int lane)
    {
        for (var j = 0; j < Layout.J; j++)
        {
            offered[j] = reader.IsOffered(lane, j);
            utility[j] = 0;
        }

        var columns = Layout.Design.Columns;
        for (var i = 0; i < columns.Length; i++)
        {
            Covariates[i] = reader.Value(columns[i].Storage, lane);
            if (offered[columns[i].Alternative]) utility[columns[i].Alternative] += parameters[columns[i].Parameter] * Covariates[i];
        }
    }

    private void AddHypothetical(int choice, double probability)
    {
        Hypothetical(choice, hypothetical);
        for (var r = 0; r < hypothetical.Length; r++)
        {
            var f = probability * hypothetical[r];
            if (f == 0) continue;
            for (var c = r; c < hypothetical.Length; c++) Covariance[(r * Layout.Stride) + c] += f * hypothetical[c];
        }
    }
}
