using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>
/// Delete-one-cluster jackknife: V = (G-1)/G sum_g (th_(g) - th)(th_(g) - th)', centred at the full estimate th, with t(G-1)
/// (MacKinnon, Nielsen and Webb 2023, "Fast and reliable jackknife and bootstrap methods for cluster-robust inference"; for a linear
/// model it is the HC3 form of Bell and McCaffrey 2002). th_(g) comes from a full refit without cluster g; the one-step form replaces it
/// by one Newton step, th_(g) = th - (H - H_g)^-1 s_g, H_g the cluster's part of H and s_g its score (MacKinnon, Nielsen and Webb 2024
/// give it for the logit). Deviations of a dissimilarity are of itself, not of its logarithm.
/// </summary>
internal static class ClusterJackknife
{
    /// <summary>Up to this number of clusters the automatic choice is a full refit without each.</summary>
    public const int MostRefits = 1000;

    /// <summary>Clusters whose information the one-step form holds at a time: those of all would outgrow the panel.</summary>
    public const int ClustersAtOnce = 2_048;

    /// <summary>The estimate, and how it went (null when off or refused beforehand).</summary>
    public static (CovarianceEstimate Covariance, JackknifeSummary? Summary) Estimate(InferenceInput input, ScoreSums scores, JackknifeKind kind, WorkContext work)
    {
        if (kind == JackknifeKind.Off) return (Refuse("The jackknife is switched off."), null);
        if (input.Clusters.Length < 2) return (Refuse("There is one cluster only: without it nothing is left to estimate from."), null);
        return Refits(kind, input.Clusters.Length) ? ByRefits(input, work) : ByOneStep(input, scores.ByCluster, work);
    }

    /// <summary>Whether this kind means a full refit without each of so many clusters.</summary>
    public static bool Refits(JackknifeKind kind, int clusters) =>
        clusters > 1 && (kind == JackknifeKind.Refit || (kind == JackknifeKind.Auto && clusters <= MostRefits));

    private static (CovarianceEstimate, JackknifeSummary) ByRefits(InferenceInput input, WorkContext work)
    {
        var refits = JackknifeRefits.Run(input, work);
        var summary = new JackknifeSummary(
            JackknifeKind.Refit, input.Clusters.Length, refits.Failed, ImmutableCollectionsMarshal.AsImmutableArray(refits.Deviations))
        {
            LargestDecrement = refits.LargestDecrement,
        };
        if (refits.Hopeless.Count > 0)
        {
            var (cluster, failure) = refits.Hopeless[0];
            var more = refits.Hopeless.Count > 1 ? $" (and {refits.Hopeless.Count - 1} more)" : "";
            return (Refuse($"The refit without {Name(input, cluster)}{more} failed: {failure}."), summary);
        }

        if (refits.Lost.Count == input.Free.Length)
        {
            var (place, at) = refits.Lost.First();
            return (Refuse(LostSentence(input, place, at) + " The same holds for every other term."), summary);
        }

        var covariance = FromDeviations(input, refits.Deviations, refits.Lost.Keys, work.Threads) with
        {
            Cautions = [.. refits.Lost.Select(l =>
                LostSentence(input, l.Key, l.Value) + " The other terms are then estimated with it held at its full-sample value.")],
            RefusedParameters = [.. refits.Lost.Keys],
            RefusedReasons = [.. refits.Lost.Select(l => LostSentence(input, l.Key, l.Value))],
        };
        return (covariance, summary);
    }

    private static (CovarianceEstimate, JackknifeSummary?) ByOneStep(InferenceInput input, ImmutableArray<double> scores, WorkContext work)
    {
        var clusters = input.Clusters.Length;
        var f = input.Free.Length;
        ImmutableArray<double> parts = [];
        var deviations = new double[clusters * f];
        var failures = new List<(int Cluster, int Term)>();
        var without = new double[f * f];
        for (var g = 0; g < clusters; g++)
        {
            if (g % ClustersAtOnce == 0)
            {
                work.Report("jackknife", g, clusters);
                parts = input.ClusterInformation(g, Math.Min(ClustersAtOnce, clusters - g));
            }

            for (var i = 0; i < without.Length; i++) without[i] = input.Information[i] - parts[(g % ClustersAtOnce * f * f) + i];
            var row = deviations.AsSpan(g * f, f);
            if (ScaledCholesky.Factor(without, f, out var failed) is not { } factor)
            {
                failures.Add((g, failed));
                row.Fill(double.NaN);
                continue;
            }

            for (var k = 0; k < f; k++) row[k] = -scores[(g * f) + k];
            factor.Solve(row);
        }

        work.Report("jackknife", clusters, clusters);
        var summary = new JackknifeSummary(JackknifeKind.OneStep, clusters, failures.Count, ImmutableCollectionsMarshal.AsImmutableArray(deviations));
        if (failures.Count > 0)
        {
            var (cluster, term) = failures[0];
            var more = failures.Count > 1 ? $" (and {failures.Count - 1} more)" : "";
            return (Refuse(
                $"The one-step form does not exist: without {Name(input, cluster)}{more} the information left is not positive definite in "
                + $"{PooledCovariance.NameOf(input, term)}. Full refits are the remedy."), summary);
        }

        return (FromDeviations(input, deviations, [], work.Threads) with
        {
            Cautions = ["One Newton step stands for each refit; with few clusters full refits can differ from it much."],
        }, summary);
    }

    private static CovarianceEstimate FromDeviations(InferenceInput input, double[] deviations, ICollection<int> lost, int threads)
    {
        var clusters = input.Clusters.Length;
        var f = input.Free.Length;
        var factor = (clusters - 1.0) / clusters;
        // NaN in a lost term's column stays in that term's row and column of the products.
        var covariance = Sandwich.OuterSum(deviations, f, threads);
        for (var i = 0; i < covariance.Length; i++) covariance[i] *= factor;
        foreach (var k in lost)
            for (var c = 0; c < f; c++) covariance[(k * f) + c] = covariance[(c * f) + k] = double.NaN;
        return CovarianceEstimate.Of(CovarianceKind.Jackknife, covariance, f, factor, clusters, []);
    }

    private static string LostSentence(InferenceInput input, int place, List<(int Cluster, string Kind)> at)
    {
        var more = at.Count > 1 ? $" (and without {at.Count - 1} more, one at a time)" : "";
        return $"Without {Name(input, at[0].Cluster)}{more} {PooledCovariance.NameOf(input, place)} cannot be estimated ({at[0].Kind}), so it has no jackknife.";
    }

    private static string Name(InferenceInput input, int cluster) => $"{input.ClusterBy} {input.Clusters[cluster]}";

    private static CovarianceEstimate Refuse(string reason) => CovarianceEstimate.Refused(CovarianceKind.Jackknife, reason);
}
