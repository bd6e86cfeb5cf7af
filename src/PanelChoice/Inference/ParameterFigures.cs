using System.Collections.Immutable;
using PanelChoice.Design;

namespace PanelChoice.Inference;

/// <summary>
/// Turns covariance estimates into what is printed of one free parameter. Intervals: pooled and robust against the normal; clustered,
/// jackknife and bootstrap against t(G-1), around the estimate. A dissimilarity l is positive and skew: its interval is
/// exp(log l +- q se(l)/l), and its p-value asks whether log l equals the logarithm of its parent's, with the covariance of the two where
/// the parent's is estimated as well.
/// </summary>
internal sealed class ParameterFigures(
    InferenceInput input, ImmutableDictionary<CovarianceKind, CovarianceEstimate> covariances, BootstrapSummary? bootstrap, JackknifeSummary? jackknife, double confidence)
{
    private const string WeightUnit = "It depends on the unit of the sampling weights, so no interval or p-value is made from it.";

    private readonly Dictionary<(CovarianceKind, double), double> critical = [];
    private readonly double[][] replicates = bootstrap is null ? [] : ByParameter(input, bootstrap);

    /// <summary>The figures of one free parameter.</summary>
    /// <param name="place">Its place among the free ones.</param>
    public ParameterInference Of(int place)
    {
        var figures = covariances.Values.ToImmutableDictionary(c => c.Kind, c => Figures(c, place));
        var intervals = Intervals(place, figures);
        var pooled = figures[CovarianceKind.Pooled].StandardError;
        var clustered = figures[CovarianceKind.Cluster].StandardError;
        // Weights of mean 1 give the pooled figure the scale of as many occasions as there are; the clustered one does not depend on their unit.
        var scaled = pooled * Math.Sqrt(input.MeanWeight);
        var ratio = clustered is > 0 && scaled is > 0 ? clustered / scaled : null;
        var jackknife = input.Clusters.Length < ClusterCovariance.FewClusters ? figures[CovarianceKind.Jackknife].StandardError : null;
        return new ParameterInference(
            input.Free[place], figures, intervals.Percentile,
            figures[CovarianceKind.Bootstrap].StandardError / Math.Sqrt(2.0 * (bootstrap?.Done ?? 0)),
            ratio, input.Occasions / (ratio * ratio))
        {
            JackknifeSeRatio = jackknife is > 0 && scaled is > 0 ? jackknife / scaled : null,
            PercentileReason = intervals.PercentileReason,
            BootstrapAccelerated = intervals.Accelerated,
            AcceleratedReason = intervals.AcceleratedReason,
            BootstrapStudentised = intervals.Studentised,
            StudentisedReason = intervals.StudentisedReason,
            BootstrapErrors = intervals.Errors,
            RatioReason = ratio is null
                ? figures[CovarianceKind.Pooled].Reason is { } p && pooled is null ? p : figures[CovarianceKind.Cluster].Reason
                : null,
            RatioLabel = input.IsWeighted ? "with sampling weights scaled to mean 1 over occasions" : null,
        };
    }

    private KindFigures Figures(CovarianceEstimate covariance, int place)
    {
        if (covariance.Matrix is not { } v) return new KindFigures(null, null, null, covariance.Refusal);
        var at = covariance.RefusedParameters.IndexOf(place);
        if (at >= 0) return new KindFigures(null, null, null, covariance.RefusedReasons[at]);
        var variance = covariance.VarianceOf(place);
        if (!(variance >= 0)) return new KindFigures(null, null, null, "Its variance comes out negative or not as a number.");
        var se = Math.Sqrt(variance);
        if (se == 0) return new KindFigures(0, null, null, "Its standard error comes out as zero, so that it supports no interval and no test.");
        if (covariance.Kind == CovarianceKind.OuterProduct)
            return new KindFigures(se, null, null, input.IsWeighted ? WeightUnit : "It is a check on specification and gives a standard error only.");
        if (covariance.Kind == CovarianceKind.ClusterUncorrected)
            return new KindFigures(se, null, null, "The form without the factor gives a standard error only.");
        if (covariance.Kind == CovarianceKind.Pooled && input.IsWeighted) return new KindFigures(se, null, null, WeightUnit);
        var degrees = covariance.DegreesOf(place);
        if (degrees is { } none && !double.IsFinite(none))
            return new KindFigures(se, null, null, "Its degrees of freedom do not exist, so that no interval and no p-value is made from it.");
        var reference = new ReferenceDistribution(degrees);
        var (p, reason) = PValue(covariance, place, reference);
        return new KindFigures(se, IntervalOf(place, se, Critical(covariance.Kind, reference)), p, reason) { DegreesOfFreedom = degrees };
    }

    /// <summary>The half-width of an interval in standard errors, the same for all parameters of a kind with as many degrees of freedom.</summary>
    private double Critical(CovarianceKind kind, ReferenceDistribution reference)
    {
        var key = (kind, reference.DegreesOfFreedom ?? double.PositiveInfinity);
        if (!critical.TryGetValue(key, out var q)) critical[key] = q = reference.Critical(confidence);
        return q;
    }

    private Interval IntervalOf(int place, double se, double q)
    {
        var estimate = input.Estimates[input.Free[place]];
        if (input.Kinds[input.Free[place]] == ParameterKind.Coefficient) return new Interval(estimate - (q * se), estimate + (q * se));
        var width = Math.Exp(q * se / estimate);
        return new Interval(estimate / width, estimate * width);
    }

    private (double? P, string? Reason) PValue(CovarianceEstimate covariance, int place, ReferenceDistribution reference)
    {
        var v = covariance.Matrix!;
        var own = covariance.VarianceOf(place);
        var tested = input.Nulls[place];
        if (tested.Withheld is { } withheld) return (null, withheld);
        var estimate = input.Estimates[input.Free[place]];
        if (input.Kinds[input.Free[place]] == ParameterKind.Coefficient)
            return (reference.TwoSided((estimate - tested.Value) / Math.Sqrt(own)), null);
        var variance = (tested.Parameter is null ? own : v[place, place]) / (estimate * estimate);
        if (tested.Parameter is { } parent)
        {
            var at = input.Free.IndexOf(parent);
            variance += (v[at, at] / (tested.Value * tested.Value)) - (2 * v[place, at] / (estimate * tested.Value));
            if (!(variance > 0))
                return (null, $"Its distance from the parent's dissimilarity '{input.Labels[parent]}' has no usable variance.");
        }

        return (reference.TwoSided(Math.Log(estimate / tested.Value) / Math.Sqrt(variance)), null);
    }

    private BootstrapIntervals Intervals(int place, ImmutableDictionary<CovarianceKind, KindFigures> figures)
    {
        var covariance = covariances[CovarianceKind.Bootstrap];
        return bootstrap is null || covariance.Matrix is null
            ? BootstrapIntervals.None(covariance.Refusal)
            : BootstrapIntervals.Of(
                input, bootstrap, jackknife, place, replicates[place], figures[CovarianceKind.Bootstrap].StandardError, figures[CovarianceKind.Cluster], confidence);
    }

    /// <summary>Values of each free parameter over the replicates that converged, ascending.</summary>
    private static double[][] ByParameter(InferenceInput input, BootstrapSummary bootstrap) =>
        [.. input.Free.Select(k => Enumerable.Range(0, bootstrap.Requested)
            .Select(r => bootstrap.Estimates[(r * input.Estimates.Length) + k])
            .Where(x => !double.IsNaN(x)).Order().ToArray())];
}
