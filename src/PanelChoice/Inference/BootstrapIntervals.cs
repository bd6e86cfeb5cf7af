using System.Collections.Immutable;
using PanelChoice.Design;

namespace PanelChoice.Inference;

/// <summary>The intervals that the replicates give one parameter, with their Monte-Carlo errors, or the reasons why one is missing.</summary>
/// <param name="Percentile">Percentile interval.</param>
/// <param name="PercentileReason">Why there is none.</param>
/// <param name="Accelerated">Bias-corrected and accelerated interval.</param>
/// <param name="AcceleratedReason">Why there is none.</param>
/// <param name="Studentised">Bootstrap-t interval.</param>
/// <param name="StudentisedReason">Why there is none.</param>
/// <param name="Errors">Monte-Carlo errors; null without bootstrap.</param>
internal sealed record BootstrapIntervals(
    Interval? Percentile, string? PercentileReason, Interval? Accelerated, string? AcceleratedReason, Interval? Studentised, string? StudentisedReason,
    BootstrapErrors? Errors)
{
    /// <summary>No interval, for one reason.</summary>
    public static BootstrapIntervals None(string? reason) => new(null, reason, null, reason, null, reason, null);

    /// <summary>The intervals of one parameter.</summary>
    /// <param name="input">The fit.</param>
    /// <param name="bootstrap">The replicates.</param>
    /// <param name="jackknife">Estimates without each cluster; null when there are none.</param>
    /// <param name="place">Place of the parameter among the free ones.</param>
    /// <param name="values">Its values over the replicates that converged, ascending.</param>
    /// <param name="standardError">Its bootstrap standard error.</param>
    /// <param name="cluster">Its clustered figures.</param>
    /// <param name="confidence">Confidence level.</param>
    public static BootstrapIntervals Of(
        InferenceInput input, BootstrapSummary bootstrap, JackknifeSummary? jackknife, int place, double[] values, double? standardError, KindFigures cluster,
        double confidence)
    {
        var f = input.Free.Length;
        var raw = values;
        values = Stretched(values, input.Estimates[input.Free[place]], input.Kinds[input.Free[place]], ClusterDraw.Factor(bootstrap.Draw, input.Clusters.Length));
        var failed = bootstrap.Requested - bootstrap.Done;
        var (percentile, percentileReason) = Percentiles.Of(values, failed, confidence);
        var (low, high) = percentile is null ? default : Percentiles.Errors(values, failed, confidence);
        var estimate = input.Estimates[input.Free[place]];
        var accelerated = AcceleratedInterval.Obstacle(jackknife, bootstrap) is { } obstacle
            ? (null, null, obstacle)
            : AcceleratedInterval.Of(values, estimate, AcceleratedInterval.Acceleration(Column(jackknife!.Deviations, place, f)), confidence);
        var studentised = bootstrap.ClusterErrorsReason is { } missing ? (null, null, missing)
            : cluster.StandardError is not > 0 ? (null, null, cluster.Reason)
            : StudentisedInterval.Of(
                input.Kinds[input.Free[place]], estimate, cluster.StandardError.Value,
                Column(bootstrap.Estimates, input.Free[place], input.Estimates.Length), Column(bootstrap.ClusterErrors, place, f), confidence);
        return new BootstrapIntervals(
            percentile, percentileReason, accelerated.Interval, accelerated.Reason, studentised.Interval, studentised.Reason,
            new BootstrapErrors(
                standardError is { } se ? MonteCarloErrors.OfStandardError(se, raw) : null, percentile is null ? null : new Interval(low, high),
                accelerated.Errors, studentised.Errors));
    }

    /// <summary>Deviations from the estimate as wide as the corrected covariance; those of a dissimilarity on its log scale, so that it stays positive.</summary>
    private static double[] Stretched(double[] values, double estimate, ParameterKind kind, double factor)
    {
        if (factor == 1) return values;
        var stretch = Math.Sqrt(factor);
        return kind == ParameterKind.Coefficient
            ? [.. values.Select(x => estimate + (stretch * (x - estimate)))]
            : [.. values.Select(x => estimate * Math.Pow(x / estimate, stretch))];
    }

    private static double[] Column(ImmutableArray<double> rows, int column, int width) =>
        [.. Enumerable.Range(0, rows.Length / width).Select(r => rows[(r * width) + column])];
}
