using MathNet.Numerics.Distributions;

namespace PanelChoice.Diagnostics;

/// <summary>
/// The date score: the sum over all unordered pairs of persons n, m of one date of g_n'g_m, so that no order of persons enters. Write it as
/// half the quadratic form g'A g, with g all residuals, A the identity between different persons of one date and 0 elsewhere. Given both
/// pasts two persons' choices on a date are independent under the null, and with A_ss = identity in the basis fitted residuals have the
/// covariance S = Omega - E E' (Omega block by block). Hence, exactly in these matrices,
/// <code>
/// mean      -tr(Q) / 2,                     Q = E'A E      so b = tr(Q) / 2
/// variance  tr((A S)^2) / 2               = tr((A Omega)^2) / 2 - tr(M) + tr(Q Q) / 2,      M = E'A Omega A E
/// third cumulant  tr((A S)^3)             = tr((A Omega)^3) - 3 tr(E'A Omega A Omega A E) + 3 tr(M Q) - tr(Q^3)
/// A_ms = sum of pairs (E_n'g_m + E_m'g_n): minus the mean derivative of the moment, both ways; it takes off what a small total score leaves
/// </code>
/// The terms in E are what estimating the parameters does. They are of second order in the number of dates, but there are few dates: with
/// alternative-specific constants in the model one date in T is used up, and the first-order variance is too large by 1 / (T - 1). The
/// statistic is a sum of few squares, so its upper tail is longer than the normal's: the p-value matches its third cumulant by a
/// shifted gamma distribution (Pearson type III).
/// </summary>
/// <param name="Score">Corrected value and variance.</param>
/// <param name="ThirdCumulant">Third cumulant under the null.</param>
internal sealed record DateMoment(CorrectedScore Score, double ThirdCumulant)
{
    private const double SmallestSkewness = 1e-6;

    /// <summary>Whether the moment has any variance.</summary>
    public bool IsDefined => Score.IsDefined;

    /// <summary>z; NaN when undefined.</summary>
    public double Z => Score.Z;

    /// <summary>One-sided p-value.</summary>
    public double PValue => UpperTail(Score.Z, ThirdCumulant / Math.Pow(Score.Variance, 1.5));

    /// <summary>Upper tail of a standardised Pearson type III variable, by the cube-root transform of the gamma (Wilson and Hilferty 1931).</summary>
    /// <param name="z">Standardised value.</param>
    /// <param name="skewness">Skewness; the normal tail where it is not positive.</param>
    internal static double UpperTail(double z, double skewness)
    {
        if (!(skewness > SmallestSkewness)) return Normal.CDF(0, 1, -z);
        var scaled = 1 + (skewness * z / 2);
        return scaled <= 0 ? 1 : Normal.CDF(0, 1, -((6 / skewness * (Math.Cbrt(scaled) - 1)) + (skewness / 6)));
    }
}
