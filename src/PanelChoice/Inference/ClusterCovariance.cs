using System.Collections.Immutable;

namespace PanelChoice.Inference;

/// <summary>
/// Clustered: V = c H^-1 (sum s_g s_g') H^-1, s_g the sum of a cluster's scores (Liang and Zeger 1986), c = G/(G-1), or 1 in the
/// uncorrected form. No (N-1)/(N-k) is in it: for maximum likelihood the factor G/(G-1) alone is the usual one, and which factor is
/// used is stated beside the matrix. It allows for any dependence inside a cluster and none between clusters.
/// </summary>
internal static class ClusterCovariance
{
    /// <summary>
    /// Below this number of clusters a caution is given and the jackknife ratio is shown beside the clustered one. Simulated size of a
    /// nominal 5 percent test with t(G-1) on a term held by a fifth of the persons: 19, 12 and 8 percent with 10, 20 and 40 clusters.
    /// </summary>
    public const int FewClusters = 40;

    /// <summary>Both forms: with the factor, and without.</summary>
    /// <param name="input">What is known of the model.</param>
    /// <param name="bread">H^-1, F x F.</param>
    /// <param name="scores">Sums of the scores of each cluster, G x F.</param>
    /// <param name="threads">Threads; no figure depends on it.</param>
    public static (CovarianceEstimate Corrected, CovarianceEstimate Uncorrected) Estimate(
        InferenceInput input, double[] bread, ReadOnlyMemory<double> scores, int threads)
    {
        var clusters = input.Clusters.Length;
        if (clusters < 2)
        {
            const string Reason = "There is one cluster only: its scores sum to zero at the estimate, and nothing tells how clusters vary.";
            return (CovarianceEstimate.Refused(CovarianceKind.Cluster, Reason), CovarianceEstimate.Refused(CovarianceKind.ClusterUncorrected, Reason));
        }

        var f = input.Free.Length;
        var meat = Sandwich.OuterSum(scores, f, threads);
        var factor = clusters / (clusters - 1.0);
        var cautions = Cautions(input);
        return (
            CovarianceEstimate.Of(CovarianceKind.Cluster, Sandwich.Of(bread, meat, factor, f), f, factor, clusters, cautions),
            CovarianceEstimate.Of(CovarianceKind.ClusterUncorrected, Sandwich.Of(bread, meat, 1, f), f, 1, clusters, cautions));
    }

    private static ImmutableArray<string> Cautions(InferenceInput input)
    {
        var clusters = input.Clusters.Length;
        var cautions = ImmutableArray.CreateBuilder<string>();
        if (clusters < FewClusters)
            cautions.Add($"With {clusters} clusters the clustered standard error tends to be too small even with t({clusters - 1}); read the jackknife beside it.");
        if (clusters - 1 < input.Free.Length)
            cautions.Add($"With {clusters} clusters the matrix has rank {clusters - 1} at most, so terms can be tested jointly {clusters - 1} at a time at most.");
        if (input.ClusterOccasions.All(n => n == 1))
            cautions.Add("Every cluster has one occasion, so that clustering changes nothing but the factor.");
        return cautions.ToImmutable();
    }
}
