using MathNet.Numerics.Distributions;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>
/// Bias-corrected and accelerated percentile interval (BCa; Efron 1987, "Better bootstrap confidence intervals"), clusters being the units that the
/// acceleration leaves out: z0 = Phi^-1(share of replicates below the estimate), a = sum u^3 / (6 (sum u^2)^(3/2)), u_g = mean of th_(g) minus th_(g), and the
/// ends are the replicates' quantiles at Phi(z0 + (z0 + z) / (1 - a (z0 + z))), z the normal quantiles of the plain ends.
/// </summary>
internal static class AcceleratedInterval
{
    /// <summary>Why no parameter has one; null when nothing stands against it.</summary>
    public static string? Obstacle(JackknifeSummary? jackknife, BootstrapSummary bootstrap) =>
        bootstrap.Draw != BootstrapDraw.Counts ? "Exponential weights double the skewness of the draws that this interval counts on; read the percentile interval."
        : bootstrap.Blocks != BootstrapBlocks.Cluster ? "Its acceleration leaves out persons, while the replicates draw blocks of occasions or days."
        : jackknife is not { Kind: JackknifeKind.Refit } ? "Its acceleration needs a full refit without each cluster: jackknife = \"refit\"."
        : bootstrap.Done < bootstrap.Requested
            ? "Replicates failed, and its bias correction rests on how many lie below the estimate; the percentile interval counts them at both ends."
        : null;

    /// <summary>The acceleration.</summary>
    /// <param name="deviations">th_(g) - th for each cluster; NaN where a refit failed.</param>
    /// <returns>The acceleration; NaN where it does not exist.</returns>
    public static double Acceleration(double[] deviations)
    {
        var mean = deviations.Average();
        double square = 0, cube = 0;
        foreach (var d in deviations)
        {
            var u = mean - d;
            square += u * u;
            cube += u * u * u;
        }

        return cube / (6 * Math.Pow(square, 1.5));
    }

    /// <summary>The interval with the Monte-Carlo errors of its ends, or the reason why there is none.</summary>
    /// <param name="values">The replicates, ascending.</param>
    /// <param name="estimate">The full estimate.</param>
    /// <param name="acceleration">The acceleration.</param>
    /// <param name="confidence">Confidence level.</param>
    public static (Interval? Interval, Interval? Errors, string? Reason) Of(double[] values, double estimate, double acceleration, double confidence)
    {
        if (!double.IsFinite(acceleration)) return (null, null, "The jackknife cannot leave out every cluster for this term, so that there is no acceleration.");
        var below = (values.Count(x => x < estimate) + (0.5 * values.Count(x => x == estimate))) / values.Length;
        if (below is <= 0 or >= 1) return (null, null, "All replicates lie on one side of the estimate, so that the bias correction is infinite.");
        var z0 = Normal.InvCDF(0, 1, below);
        var tail = Normal.InvCDF(0, 1, (1 - confidence) / 2);
        var (low, lowError) = End(tail);
        var (high, highError) = End(-tail);
        return low is null || high is null
            ? (null, null, $"With {values.Length} replicates an end lies beyond the outermost of them; more replicates give it.")
            : (new Interval(low.Value, high.Value), new Interval(lowError, highError), null);

        (double? Value, double Error) End(double z)
        {
            var u = z0 + z;
            var shrink = 1 - (acceleration * u);
            if (!(shrink > 0)) return (null, 0);
            var at = z0 + (u / shrink);
            var share = Normal.CDF(0, 1, at);
            var place = Math.Round(share * (values.Length + 1), 9);
            if (!(place >= 1 && place <= values.Length)) return (null, 0);
            // The end is a quantile at a level that was estimated too: with I(.) indicators its influence is -[I(x <= end) - share - c (I(x < th) - below)] / f(end).
            var c = Normal.PDF(0, 1, at) * (1 + (1 / (shrink * shrink))) / Normal.PDF(0, 1, z0);
            var plain = share * (1 - share);
            var whole = plain + (c * c * below * (1 - below)) - (2 * c * (Math.Min(share, below) - (share * below)));
            return (Percentiles.At(values, place), MonteCarloErrors.OfQuantile(values, place) * Math.Sqrt(Math.Max(0, whole) / plain));
        }
    }
}
