using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// Generalised residuals of one situation after another in the space (V, l), for the observed choice, and their covariance over all hypothetical choices
/// i, enumerated, so that expectations given the past are exact on a tree of any depth and in both forms.
/// <code>
/// f^i = (d log P(i) / dV, d log P(i) / dl)     f = f^chosen     Omega = sum_i P_i f^i f^i'     (the mean of f^i is 0)
/// </code>
/// One instance is a work space: it is not for use by several threads at once.
/// </summary>
internal abstract class SituationResiduals
{
    private protected SituationResiduals(ResidualLayout layout)
    {
        Layout = layout;
        Probability = new double[layout.Stride];
        Residual = new double[layout.Stride];
        Covariance = new double[layout.Size * layout.Stride];
        Covariates = new double[layout.Design.Columns.Length];
    }

    /// <summary>The space.</summary>
    public ResidualLayout Layout { get; }

    /// <summary>P_i of the situation read last (J); 0 where not offered.</summary>
    public double[] Probability { get; }

    /// <summary>f of its choice (J + D).</summary>
    public double[] Residual { get; }

    /// <summary>Omega, J + D rows of <see cref="ResidualLayout.Stride"/>; 0 where an alternative is not offered.</summary>
    public double[] Covariance { get; }

    /// <summary>
    /// The covariate of each of the design's columns, times <see cref="UnitsOf"/>; what stands where the alternative is not offered
    /// does not matter, because nothing is multiplied with it but 0.
    /// </summary>
    public double[] Covariates { get; }

    /// <summary>By how much the covariates of a parameter are larger here than in the user's units.</summary>
    public abstract double UnitsOf(int parameter);

    /// <summary>Makes a run of a block's situations ready to be read.</summary>
    /// <param name="block">The block.</param>
    /// <param name="first">First situation of the run, counted from the block's first: 0, or where the run before ended.</param>
    /// <returns>How many situations the run has.</returns>
    public abstract int Open(DesignBlock block, int first);

    /// <summary>Reads a situation of the open run.</summary>
    /// <param name="place">Its place in the run.</param>
    public abstract void Read(int place);
}
