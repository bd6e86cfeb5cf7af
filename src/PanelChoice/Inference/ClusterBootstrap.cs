using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Estimation;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>
/// Cluster bootstrap (pairs or block bootstrap; Efron 1979; Cameron, Gelbach and Miller 2008): each replicate is a full refit, started at
/// the full estimate, on G clusters drawn with replacement. V = 1/(B-1) sum (th*_b - mean)(th*_b - mean)' over the B replicates that
/// converged. Failed replicates are counted by kind, never dropped in silence or drawn again: failures are not a random sample of draws,
/// so that above 5 percent of them the covariance is refused.
/// </summary>
internal static class ClusterBootstrap
{
    /// <summary>Largest share of failed replicates with which a covariance is given.</summary>
    public const double MostFailures = 0.05;

    /// <summary>Why no replicate is made; null when they are.</summary>
    public static string? Obstacle(InferenceInput input, InferenceSettings settings) =>
        settings.Replicates <= 0 ? "No bootstrap replicates were asked for."
        : settings.Blocks != BootstrapBlocks.Cluster ? BlocksObstacle(input)
        : input.Clusters.Length < 2 ? "There is one cluster only: every draw with replacement is the sample itself."
        : null;

    /// <summary>The estimate, and how it went (null when not asked for or refused beforehand).</summary>
    public static (CovarianceEstimate Covariance, BootstrapSummary? Summary) Estimate(
        InferenceInput input, InferenceSettings settings, WorkContext work)
    {
        if (Obstacle(input, settings) is { } reason) return (Refuse(reason), null);
        var first = settings.Target is { } target ? ReplicateNumber.First(target) : settings.Replicates;
        var outcomes = Replicates(input, settings, 0, first, work);
        var summary = Summarise(input, settings, outcomes);
        var isOutOfReach = false;
        if (settings.Target is { } wanted && !IsRefused(summary))
        {
            var kurtosis = LargestKurtosis(input, summary);
            isOutOfReach = ReplicateNumber.IsOutOfReach(wanted, kurtosis);
            if (ReplicateNumber.Needed(wanted, kurtosis) - first is > 0 and var more)
                summary = Summarise(input, settings, outcomes.AddRange(Replicates(input, settings, first, more, work)));
        }

        var covariance = Covariance(input, summary, settings, work.Threads);
        if (isOutOfReach)
            covariance = covariance with
            {
                Cautions = covariance.Cautions.Add(
                    $"The replicates' tails are so heavy that the target of replicates = \"auto\" asks for more than {ReplicateNumber.Most}; it was not reached."),
            };
        if ((covariance.Refusal ?? ReplicateErrors.Obstacle(input, settings, summary)) is { } none) return (covariance, summary with { ClusterErrorsReason = none });
        return (covariance, summary with { ClusterErrors = ReplicateErrors.Of(input, r => Weights(input, settings, r), summary, work) });
    }

    /// <summary>Refits of a stretch of replicates. Replicate r is the same whatever stretch it is made in.</summary>
    public static ImmutableArray<RefitOutcome> Replicates(InferenceInput input, InferenceSettings settings, int first, int count, WorkContext work) =>
        NumberedRefits.Make(
            settings.Blocks == BootstrapBlocks.Cluster ? input : input with { Refitter = input.Blocks!.Refitter! },
            RefitSeries.Bootstrap, [.. Enumerable.Range(first, count)],
            r => new RefitRequest(Weights(input, settings, r), input.Estimates, []) { Number = r }, work);

    private static ImmutableArray<double> Weights(InferenceInput input, InferenceSettings settings, int replicate) =>
        settings.Blocks == BootstrapBlocks.Cluster
            ? ClusterDraw.Weights(settings.Draw, settings.BootstrapSeed, replicate, input.Clusters.Length)
            : input.Blocks!.Weights!(replicate);

    private static string? BlocksObstacle(InferenceInput input) =>
        input.Blocks is { } blocks ? blocks.Obstacle : "This likelihood has no blocks of occasions to draw.";

    /// <summary>Counts what became of the replicates and lays their estimates out.</summary>
    public static BootstrapSummary Summarise(InferenceInput input, InferenceSettings settings, ImmutableArray<RefitOutcome> outcomes)
    {
        var k = input.Estimates.Length;
        var estimates = new double[outcomes.Length * k];
        Array.Fill(estimates, double.NaN);
        var logLikelihood = new double[outcomes.Length];
        Array.Fill(logLikelihood, double.NaN);
        var decrement = new double[outcomes.Length];
        Array.Fill(decrement, double.NaN);
        var status = new string[outcomes.Length];
        for (var r = 0; r < outcomes.Length; r++)
        {
            if (FailedReplicates.HasConverged(outcomes[r], input))
            {
                status[r] = "converged";
                logLikelihood[r] = outcomes[r].LogLikelihood;
                decrement[r] = outcomes[r].Decrement;
                outcomes[r].Parameters.CopyTo(estimates, r * k);
            }
            else
            {
                status[r] = FailureKinds.Of(outcomes[r]);
            }
        }

        var failures = Enumerable.Range(0, outcomes.Length).Where(r => !FailedReplicates.HasConverged(outcomes[r], input))
            .GroupBy(r => status[r], StringComparer.Ordinal)
            .OrderByDescending(g => g.Count()).ThenBy(g => g.Key, StringComparer.Ordinal)
            .Select(g => new ReplicateFailures(g.Key, g.Count(), [.. g])
            {
                Parameters = [.. g.SelectMany(r => outcomes[r].FailedParameters.Distinct()).GroupBy(p => p)
                    .OrderByDescending(p => p.Count()).ThenBy(p => p.Key).Select(p => p.Key)],
            })
            .ToImmutableArray();
        return new BootstrapSummary(
            outcomes.Length, outcomes.Length - failures.Sum(f => f.Count), outcomes.Count(o => o.Retried), failures,
            ImmutableCollectionsMarshal.AsImmutableArray(estimates), ImmutableCollectionsMarshal.AsImmutableArray(logLikelihood),
            ImmutableCollectionsMarshal.AsImmutableArray(status))
        {
            Decrement = ImmutableCollectionsMarshal.AsImmutableArray(decrement),
            Draw = settings.Draw,
            Blocks = settings.Blocks,
            BlockLength = settings.Blocks == BootstrapBlocks.Cluster ? null : input.Blocks?.Length,
            IsLengthAutomatic = settings.Blocks != BootstrapBlocks.Cluster && input.Blocks is { IsAutomatic: true },
            Target = settings.Target,
            Failed = FailedReplicates.List(input, outcomes),
            ErrorsWithFailures = FailedReplicates.StandardErrors(input, outcomes, ClusterDraw.Factor(settings.Draw, input.Clusters.Length)),
        };
    }

    /// <summary>Covariance of the replicates around their mean, or a refusal.</summary>
    private static CovarianceEstimate Covariance(InferenceInput input, BootstrapSummary summary, InferenceSettings settings, int threads)
    {
        var failed = summary.Requested - summary.Done;
        if (failed > MostFailures * summary.Requested)
            return Refuse(
                $"{failed} of {summary.Requested} replicates failed ({Describe(input, summary)}), more than 5 percent. Failures are not a random "
                + $"sample of the draws, so the spread of the others would mislead; {Alternative(settings)}.");
        if (summary.Done < 2) return Refuse($"{summary.Done} of {summary.Requested} replicates converged; a spread needs two.");

        var f = input.Free.Length;
        var k = input.Estimates.Length;
        var rows = new double[summary.Done * f];
        var mean = new double[f];
        var row = 0;
        for (var r = 0; r < summary.Requested; r++)
        {
            if (double.IsNaN(summary.LogLikelihood[r])) continue;
            for (var p = 0; p < f; p++)
            {
                // Deviations from the full estimate first: they are small, so that the mean loses no digits.
                rows[(row * f) + p] = summary.Estimates[(r * k) + input.Free[p]] - input.Estimates[input.Free[p]];
                mean[p] += rows[(row * f) + p];
            }

            row++;
        }

        for (var i = 0; i < rows.Length; i++) rows[i] -= mean[i % f] / summary.Done;
        var covariance = Sandwich.OuterSum(rows, f, threads);
        var factor = ClusterDraw.Factor(settings.Draw, input.Clusters.Length);
        for (var i = 0; i < covariance.Length; i++) covariance[i] *= factor / (summary.Done - 1);
        var units = settings.Blocks == BootstrapBlocks.Cluster ? input.Clusters.Length : input.Blocks!.Blocks;
        return CovarianceEstimate.Of(CovarianceKind.Bootstrap, covariance, f, factor, units, Cautions(input, summary, settings.Confidence, rows));
    }

    private static bool IsRefused(BootstrapSummary summary) => summary.Done < 2 || summary.Requested - summary.Done > MostFailures * summary.Requested;

    /// <summary>What to do where too many replicates fail.</summary>
    private static string Alternative(InferenceSettings settings) =>
        settings is { Blocks: BootstrapBlocks.Cluster, Draw: BootstrapDraw.Counts }
            ? "exponential weights lose no cluster (draw = \"exponential\"), or read the jackknife"
            : "read the jackknife instead";

    /// <summary>The largest kurtosis of the replicates over the free parameters; that of a normal distribution where none varies.</summary>
    private static double LargestKurtosis(InferenceInput input, BootstrapSummary summary) =>
        input.Free.Select(k => MonteCarloErrors.Kurtosis(
            [.. Enumerable.Range(0, summary.Requested).Select(r => summary.Estimates[(r * input.Estimates.Length) + k] - input.Estimates[k]).Where(double.IsFinite)]))
            .Where(double.IsFinite).DefaultIfEmpty(3).Max();

    /// <summary>The failures by kind, with the terms they name.</summary>
    private static string Describe(InferenceInput input, BootstrapSummary summary) =>
        string.Join(", ", summary.Failures.Select(f => f.Parameters.IsEmpty
            ? $"{f.Count} {f.Kind}"
            : $"{f.Count} {f.Kind}: {string.Join(" and ", f.Parameters.Take(3).Select(p => $"'{input.Labels[p]}'"))}"));

    private static ImmutableArray<string> Cautions(InferenceInput input, BootstrapSummary summary, double confidence, double[] centred)
    {
        var cautions = ImmutableArray.CreateBuilder<string>();
        var failed = summary.Requested - summary.Done;
        if (failed > 0)
            cautions.Add(
                $"{failed} of {summary.Requested} replicates failed ({Describe(input, summary)}). The standard error rests on the others; the "
                + "percentile interval counts the failed ones below its lower and above its upper end.");
        if (summary.Done <= input.Free.Length)
            cautions.Add($"With {summary.Done} replicates the matrix has rank {summary.Done - 1} at most, so no more terms than that can be tested jointly.");
        if (Percentiles.Position(summary.Requested, confidence) < Percentiles.NearestReliable)
            cautions.Add($"The ends of the percentile interval hang on the outermost of {summary.Requested} replicates; more replicates make them reliable.");
        var heavy = Enumerable.Range(0, input.Free.Length).Where(p => IsHeavyTailed(centred, p, input.Free.Length)).ToList();
        if (heavy.Count > 0)
            cautions.Add(
                $"A few replicates far out make up most of the spread of {string.Join(", ", heavy.Select(p => PooledCovariance.NameOf(input, p)))}; "
                + "read the percentile interval there.");
        return cautions.ToImmutable();
    }

    /// <summary>
    /// Whether the standard deviation is more than twice what the middle half of the replicates suggests. A normal distribution has 1, one
    /// of t(5) 1.2; the bound marks a spread that hangs on single draws and is descriptive.
    /// </summary>
    private static bool IsHeavyTailed(double[] centred, int place, int f)
    {
        var values = Enumerable.Range(0, centred.Length / f).Select(r => centred[(r * f) + place]).Order().ToArray();
        if (values.Length < 20) return false;
        var middle = MathNet.Numerics.Statistics.SortedArrayStatistics.InterquartileRange(values) / 1.349;
        return MathNet.Numerics.Statistics.ArrayStatistics.StandardDeviation(values) > 2 * middle;
    }

    private static CovarianceEstimate Refuse(string reason) => CovarianceEstimate.Refused(CovarianceKind.Bootstrap, reason);
}
