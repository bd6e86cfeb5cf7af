using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>Estimates without each cluster as deviations from the full ones, and how they were made.</summary>
/// <param name="From">Full refits, or one Newton step each.</param>
/// <param name="Deviations">G x F; NaN where unknown.</param>
internal sealed record DeletionChanges(JackknifeKind From, ImmutableArray<double> Deviations);

/// <summary>Sizes and leverages of the clusters, and the ones that move the estimates most.</summary>
internal static class ClusterFigures
{
    private const int MostListed = 10;

    /// <summary>The summary.</summary>
    /// <param name="input">What is known of the model.</param>
    /// <param name="cluster">Clustered covariance: its standard errors are the yardstick of influence.</param>
    /// <param name="changes">Deviations without each cluster.</param>
    /// <param name="sweep">Leverages; null where nothing has a meaning.</param>
    public static ClusterSummary Of(InferenceInput input, CovarianceEstimate cluster, DeletionChanges? changes, ClusterSweep? sweep)
    {
        var sizes = input.ClusterOccasions.Sort();
        var half = sizes.Length / 2;
        var coefficients = Enumerable.Range(0, sweep?.Terms.Length ?? 0).Where(k => input.Kinds[input.Free[k]] == ParameterKind.Coefficient).ToList();
        return new ClusterSummary(
            input.ClusterBy, sizes.Length, sizes[0], sizes.Length % 2 == 1 ? sizes[half] : (sizes[half - 1] + sizes[half]) / 2.0, sizes[^1],
            coefficients.Count == 0 ? null : coefficients.Min(k => sweep!.Terms[k].Effective), sizes.Length - 1,
            changes is null ? [] : MostInfluential(input, cluster, changes))
        {
            EffectiveReason = sweep is null ? "Without a maximum no cluster has a share in the information." : coefficients.Count == 0 ? "No coefficient is estimated." : null,
            Names = input.Clusters,
            LargestLeverage = sweep?.Leverage.Max(),
            LeverageSpread = sweep is null ? null : Spread(sweep.Leverage),
            SizeSpread = Spread([.. sizes.Select(n => (double)n)]),
            InfluenceFrom = changes?.From,
        };
    }

    /// <summary>The cluster that moves a term most; null where no change of it is known.</summary>
    public static Influence? MostInfluential(InferenceInput input, DeletionChanges? changes, int place)
    {
        if (changes is null) return null;
        var f = input.Free.Length;
        var (most, size) = (-1, -1.0);
        for (var g = 0; g < input.Clusters.Length; g++)
        {
            var here = Math.Abs(changes.Deviations[(g * f) + place]);
            if (here > size && double.IsFinite(here)) (most, size) = (g, here);
        }

        return most < 0 ? null : new Influence(most, input.Free[place], changes.Deviations[(most * f) + place]);
    }

    private static double? Spread(double[] values)
    {
        var mean = values.Sum() / values.Length;
        return values.Length < 2 || mean == 0 ? null : Math.Sqrt(values.Sum(x => (x - mean) * (x - mean)) / (values.Length - 1)) / Math.Abs(mean);
    }

    /// <summary>Each cluster with the term it moves most in clustered standard errors; the ten that move theirs most.</summary>
    private static ImmutableArray<Influence> MostInfluential(InferenceInput input, CovarianceEstimate cluster, DeletionChanges jackknife)
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
