using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>Every covariance estimate side by side, and the figures made from them.</summary>
public static class StandardErrors
{
    /// <summary>Computes them. What cannot be had is refused with its reason inside the result, never by an exception.</summary>
    /// <param name="input">What is known of the fitted model.</param>
    /// <param name="settings">Confidence, jackknife, bootstrap.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    /// <exception cref="ArgumentException">The lengths in the input do not fit together.</exception>
    public static InferenceResult Compute(InferenceInput input, InferenceSettings settings, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(input);
        ArgumentNullException.ThrowIfNull(settings);
        ArgumentNullException.ThrowIfNull(work);
        input.CheckLengths();
        if (Obstacle(input) is { } reason) return Without(input, settings, reason);

        var pooled = PooledCovariance.Estimate(input, out var bread);
        var scores = input.Scores(work.Threads);
        if (scores.OuterProduct.Length != bread!.Length || scores.ByCluster.Length != input.Clusters.Length * input.Free.Length)
            throw new ArgumentException("The sums of scores do not fit the rest of an inference input.", nameof(input));
        var meat = scores.OuterProduct;
        var (cluster, uncorrected) = ClusterCovariance.Estimate(input, bread, scores.ByCluster.AsMemory(), work.Threads);
        var (twoWay, ways) = TwoWayCovariance.Estimate(input, bread, scores, work.Threads);
        var (jackknife, deletions) = ClusterJackknife.Estimate(input, scores, settings.Jackknife, work);
        var (bootstrap, replicates) = ClusterBootstrap.Estimate(input, settings, work);
        var sweep = ClusterSweep.Over(input, scores, work)!;
        // Where the jackknife is off, one step each tells who moves what.
        var changes = deletions is not null ? new DeletionChanges(deletions.Kind, deletions.Deviations)
            : input.Clusters.Length < 2 ? null
            : new DeletionChanges(JackknifeKind.OneStep, ImmutableCollectionsMarshal.AsImmutableArray(OneStepDeletions.Of(input, scores.ByCluster, work).Deviations));
        return Assemble(
            input, settings,
            [
                pooled, OuterProductCovariance.Estimate(input, meat.AsSpan()), RobustCovariance.Estimate(input, bread, meat.AsSpan()), cluster, uncorrected, jackknife,
                twoWay, bootstrap, BiasReducedCovariance.Estimate(input, sweep),
            ],
            deletions, replicates, changes, sweep) with
        {
            TwoWay = ways,
        };
    }

    /// <summary>Why no standard error has a meaning, so that nothing is refitted; null when they have.</summary>
    internal static string? Obstacle(InferenceInput input) =>
        input.NoMaximum ?? (input.Free.IsEmpty ? "Every parameter is fixed, so that nothing was estimated." : PooledCovariance.Estimate(input, out _).Refusal);

    private static InferenceResult Without(InferenceInput input, InferenceSettings settings, string reason) =>
        Assemble(input, settings, [.. Enum.GetValues<CovarianceKind>().Select(kind => CovarianceEstimate.Refused(kind, reason))], null, null, null, null);

    private static InferenceResult Assemble(
        InferenceInput input, InferenceSettings settings, ImmutableArray<CovarianceEstimate> estimates, JackknifeSummary? jackknife,
        BootstrapSummary? bootstrap, DeletionChanges? changes, ClusterSweep? sweep)
    {
        var covariances = estimates.ToImmutableDictionary(c => c.Kind);
        var figures = new ParameterFigures(input, covariances, bootstrap, jackknife, settings.Confidence);
        return new InferenceResult(
            covariances,
            [.. Enumerable.Range(0, input.Free.Length).Select(k => figures.Of(k) with
            {
                Leverage = sweep?.Terms[k],
                MostInfluential = ClusterFigures.MostInfluential(input, changes, k),
            })],
            ClusterFigures.Of(input, covariances[CovarianceKind.Cluster], changes, sweep),
            jackknife, bootstrap);
    }
}
