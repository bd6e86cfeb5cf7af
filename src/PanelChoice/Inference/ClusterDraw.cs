using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>
/// Weights of the clusters in a replicate. Drawn with replacement, a cluster drawn twice counts as two separate clusters with the same record (Efron 1979).
/// Exponential weights of mean 1 (Rubin 1981, "The Bayesian bootstrap") never lose a cluster, so that no term vanishes. Rows carry the lags they were
/// built with, so that no joint between clusters invents a false yesterday.
/// </summary>
internal static class ClusterDraw
{
    /// <summary>How often each of the G clusters is drawn in a replicate; G draws, depending on seed and replicate alone.</summary>
    public static ImmutableArray<double> Weights(long seed, int replicate, int clusters)
    {
        var random = new CounterRandom(seed, "bootstrap", replicate);
        var weights = new double[clusters];
        for (var i = 0; i < clusters; i++) weights[random.Next(clusters)]++;
        return ImmutableCollectionsMarshal.AsImmutableArray(weights);
    }

    /// <summary>Weights of the G clusters in a replicate under either way of drawing.</summary>
    public static ImmutableArray<double> Weights(BootstrapDraw draw, long seed, int replicate, int clusters) =>
        draw == BootstrapDraw.Exponential ? Exponential(seed, replicate, clusters) : Weights(seed, replicate, clusters);

    /// <summary>What the covariance of the replicates is multiplied by: for a mean, normalised exponential weights give (G-1)/(G+1) of the unbiased variance.</summary>
    public static double Factor(BootstrapDraw draw, int clusters) => draw == BootstrapDraw.Exponential ? (clusters + 1.0) / (clusters - 1.0) : 1;

    private static ImmutableArray<double> Exponential(long seed, int replicate, int clusters)
    {
        var random = new CounterRandom(seed, "bootstrap exponential", replicate);
        var weights = new double[clusters];
        var sum = 0.0;
        for (var i = 0; i < clusters; i++) sum += weights[i] = -Math.Log(random.NextDouble());
        for (var i = 0; i < clusters; i++) weights[i] *= clusters / sum;
        return ImmutableCollectionsMarshal.AsImmutableArray(weights);
    }
}
