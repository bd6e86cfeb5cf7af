using System.Collections.Immutable;

namespace PanelChoice.Inference;

/// <summary>Sizes of the clusters, and the ones that move the estimates most.</summary>
internal static class ClusterFigures
{
    private const int MostListed = 10;

    /// <summary>The summary.</summary>
    /// <param name="input">What is known of the model.</param>
    /// <param name="cluster">Clustered covariance: its standard errors are the yardstick of influence.</param>
    /// <param name="jackknife">Deviations without each cluster; null leaves the list of the most influential empty.</param>
    public static ClusterSummary Of(InferenceInput input, CovarianceEstimate cluster, JackknifeSummary? jackknife)
    {
        var sizes = input.ClusterOccasions.Sort();
        var half = sizes.Length / 2;
        return new ClusterSummary(
            input.ClusterBy, sizes.Length, sizes[0], sizes.Length % 2 == 1 ? sizes[half] : (sizes[half - 1] + sizes[half]) / 2.0, sizes[^1],
            null, sizes.Length - 1, jackknife is null ? [] : MostInfluential(input, cluster, jackknife))
        {
            EffectiveReason = "The effective number differs from term to term; this version does not compute it.",
        };
    }

    /// <summary>Each cluster with the term it moves most in clustered standard errors; the ten that move theirs most.</summary>
    private static ImmutableArray<Influence> MostInfluential(InferenceInput input, CovarianceEstimate cluster, JackknifeSummary jackknife)
    {
        if (cluster.Matrix is not { } v) return [];
        var f = input.Free.Length;
        var found = new List<(Influence Influence, double Size)>();
        for (var g = 0; g < input.Clusters.Length; g++)
        {
            var (most, size) = (-1, 0.0);
            for (var k = 0; k < f; k++)
            {
                var here = Math.Abs(jackknife.Deviations[(g * f) + k]) / Math.Sqrt(v[k, k]);
                if (here > size && double.IsFinite(here)) (most, size) = (k, here);
            }

            if (most >= 0) found.Add((new Influence(g, input.Free[most], jackknife.Deviations[(g * f) + most]), size));
        }

        return [.. found.OrderByDescending(x => x.Size).ThenBy(x => x.Influence.Cluster).Take(MostListed).Select(x => x.Influence)];
    }
}
