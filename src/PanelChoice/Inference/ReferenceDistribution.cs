using MathNet.Numerics.Distributions;

namespace PanelChoice.Inference;

/// <summary>The distribution a statistic is read against: Student's t with the given degrees of freedom, or the normal.</summary>
/// <param name="DegreesOfFreedom">Degrees of freedom; null means the normal distribution.</param>
internal readonly record struct ReferenceDistribution(double? DegreesOfFreedom)
{
    /// <summary>The half-width of a two-sided interval in standard errors.</summary>
    /// <param name="confidence">Confidence level, inside (0, 1).</param>
    public double Critical(double confidence)
    {
        // The lower tail keeps its digits; 1 - (1 - confidence)/2 would lose some.
        var tail = (1 - confidence) / 2;
        return DegreesOfFreedom is { } df ? -StudentT.InvCDF(0, 1, df, tail) : -Normal.InvCDF(0, 1, tail);
    }

    /// <summary>Probability of a statistic at least as far from zero.</summary>
    public double TwoSided(double statistic)
    {
        var below = -Math.Abs(statistic);
        return 2 * (DegreesOfFreedom is { } df ? StudentT.CDF(0, 1, df, below) : Normal.CDF(0, 1, below));
    }
}
