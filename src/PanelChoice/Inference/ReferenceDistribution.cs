using MathNet.Numerics.Distributions;
using MathNet.Numerics.RootFinding;

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
        if (DegreesOfFreedom is not { } df) return -Normal.InvCDF(0, 1, tail);
        // The library's own inverse looks inside (-800, 800) only, which one degree of freedom leaves at a confidence of 0.9993.
        var beyond = 1.0;
        while (StudentT.CDF(0, 1, df, -beyond) > tail) beyond *= 2;
        return Brent.FindRoot(q => Math.Log(StudentT.CDF(0, 1, df, -q) / tail), 0, beyond, 1e-14, 500);
    }

    /// <summary>Probability of a statistic at least as far from zero.</summary>
    public double TwoSided(double statistic)
    {
        var below = -Math.Abs(statistic);
        return 2 * (DegreesOfFreedom is { } df ? StudentT.CDF(0, 1, df, below) : Normal.CDF(0, 1, below));
    }
}
