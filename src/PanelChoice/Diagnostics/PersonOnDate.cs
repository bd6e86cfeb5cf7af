namespace PanelChoice.Diagnostics;

/// <summary>What one person's situation brings to the sums of its date: g, P, E, O = Cov(g, g) and their products, rows padded with zeros.</summary>
internal sealed class PersonOnDate
{
    private readonly int J;
    private readonly int widthJ;

    /// <summary>A work space.</summary>
    public PersonOnDate(int alternatives, int parameters)
    {
        J = alternatives;
        widthJ = PaddedRows.Padded(alternatives);
        var widthK = PaddedRows.Padded(parameters);
        Residual = new double[widthJ];
        Probability = new double[widthJ];
        E = new double[J * widthK];
        Omega = new double[J * widthJ];
        OmegaE = new double[J * widthK];
        OmegaSquared = new double[J * widthJ];
        OmegaSquaredE = new double[J * widthK];
    }

    /// <summary>g.</summary>
    public double[] Residual { get; }

    /// <summary>P.</summary>
    public double[] Probability { get; }

    /// <summary>E, J x K.</summary>
    public double[] E { get; }

    /// <summary>O, J x J.</summary>
    public double[] Omega { get; }

    /// <summary>O E.</summary>
    public double[] OmegaE { get; }

    /// <summary>O O.</summary>
    public double[] OmegaSquared { get; }

    /// <summary>O O E.</summary>
    public double[] OmegaSquaredE { get; }

    /// <summary>Takes over the loaded situation.</summary>
    public void Set(SituationScores scores)
    {
        scores.Residual.AsSpan(0, J).CopyTo(Residual);
        scores.Probability.AsSpan(0, J).CopyTo(Probability);
        scores.Cross.CopyTo(E);
        for (var j = 0; j < J; j++) scores.Omega.AsSpan(j * scores.ResidualWidth, J).CopyTo(Omega.AsSpan(j * widthJ));
        PaddedRows.Product(Omega, widthJ, 1, Omega, J, J, widthJ, OmegaSquared);
        PaddedRows.Product(Omega, widthJ, 1, E, J, J, scores.Width, OmegaE);
        PaddedRows.Product(Omega, widthJ, 1, OmegaE, J, J, scores.Width, OmegaSquaredE);
    }
}
