using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>
/// Clusters drawn with replacement, as integer weights: a cluster drawn twice counts as two separate clusters with the same record.
/// Rows carry the lags they were built with, so that no joint between clusters invents a false yesterday.
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
}
