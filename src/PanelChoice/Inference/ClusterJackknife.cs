using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>
/// Delete-one-cluster jackknife: V = (G-1)/G sum_g (th_(g) - th)(th_(g) - th)', centred at the full estimate th, with t(G-1)
/// (MacKinnon, Nielsen and Webb 2023, "Fast and reliable jackknife and bootstrap methods for cluster-robust inference"; for a linear
/// model it is the HC3 form of Bell and McCaffrey 2002). th_(g) comes from a full refit without cluster g; the one-step form replaces it
/// by one Newton step (<see cref="OneStepDeletions"/>), from 40 clusters on. Deviations of a dissimilarity are of itself, not of its logarithm.
/// </summary>
internal static class ClusterJackknife
{
    /// <summary>Up to this number of clusters the automatic choice is a full refit without each.</summary>
    public const int MostRefits = 1000;

    /// <summary>
    /// Below this number of clusters the one-step form is not given: in single samples of 10 clusters it came out at 0.57 to 7.6 times the figure of full
    /// refits, with 40 at 0.85 to 1.03 (pooled logit, simulations made for this project).
    /// </summary>
    public const int FewestSteps = 40;

    /// <summary>Clusters whose information the one-step form holds at a time: those of all would outgrow the panel.</summary>
    public const int ClustersAtOnce = 2_048;

    /// <summary>The estimate, and how it went (null when off or refused beforehand).</summary>
    public static (CovarianceEstimate Covariance, JackknifeSummary? Summary) Estimate(InferenceInput input, ScoreSums scores, JackknifeKind kind, WorkContext work)
    {
        if (kind == JackknifeKind.Off) return (Refuse("The jackknife is switched off."), null);
        if (input.Clusters.Length < 2) return (Refuse("There is one cluster only: without it nothing is left to estimate from."), null);
        return Refits(kind, input.Clusters.Length) ? ByRefits(input, work) : ByOneStep(input, scores.ByCluster, kind, work);
    }

    /// <summary>Whether this kind means a full refit without each of so many clusters.</summary>
    public static bool Refits(JackknifeKind kind, int clusters) =>
        clusters > 1 && (kind == JackknifeKind.Refit || (kind == JackknifeKind.Auto && clusters <= MostRefits));

    private static (CovarianceEstimate, JackknifeSummary) ByRefits(InferenceInput input, WorkContext work)
    {
        var refits = JackknifeRefits.Run(input, [.. Enumerable.Range(0, input.Clusters.Length)], work);
        var summary = new JackknifeSummary(
            JackknifeKind.Refit, input.Clusters.Length, refits.Failed, ImmutableCollectionsMarshal.AsImmutableArray(refits.Deviations))
        {
            LargestDecrement = refits.LargestDecrement,
        };
        return FromRefits(input, refits, summary, work);
    }

    private static (CovarianceEstimate, JackknifeSummary) FromRefits(InferenceInput input, JackknifeRefits refits, JackknifeSummary summary, WorkContext work)
    {
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

    private static (CovarianceEstimate, JackknifeSummary?) ByOneStep(InferenceInput input, ImmutableArray<double> scores, JackknifeKind kind, WorkContext work)
    {
        var clusters = input.Clusters.Length;
        var steps = OneStepDeletions.Of(input, scores, work);
        var summary = new JackknifeSummary(
            JackknifeKind.OneStep, clusters, steps.Failures.Length, ImmutableCollectionsMarshal.AsImmutableArray(steps.Deviations));
        if (clusters < FewestSteps)
            return (Refuse(
                $"The one-step form is no substitute for refits with {clusters} clusters: below {FewestSteps} it has come out at 0.6 to 8 times the figure of full refits. "
                + "Full refits (jackknife = \"refit\") are the remedy."), summary);
        if (steps.Failures.IsEmpty)
            return (FromDeviations(input, steps.Deviations, [], work.Threads) with
            {
                Cautions = ["One Newton step stands for each refit; with few clusters full refits can differ from it much."],
            }, summary);
        if (kind == JackknifeKind.OneStep)
        {
            var (cluster, term) = steps.Failures[0];
            var more = steps.Failures.Length > 1 ? $" (and {steps.Failures.Length - 1} more)" : "";
            return (Refuse(
                $"The one-step form does not exist: without {Name(input, cluster)}{more} the information left is not positive definite in "
                + $"{PooledCovariance.NameOf(input, term)}. Full refits are the remedy."), summary);
        }

        return WithRefits(input, steps, work);
    }

    /// <summary>Steps where they exist, and full refits without the other clusters. These are made here, whoever made the numbered ones.</summary>
    private static (CovarianceEstimate, JackknifeSummary) WithRefits(InferenceInput input, OneStepDeletions steps, WorkContext work)
    {
        var f = input.Free.Length;
        var refits = JackknifeRefits.Run(input with { Journal = null }, [.. steps.Failures.Select(x => x.Cluster)], work);
        foreach (var (g, _) in steps.Failures) refits.Deviations.AsSpan(g * f, f).CopyTo(steps.Deviations.AsSpan(g * f, f));
        var summary = new JackknifeSummary(
            JackknifeKind.OneStep, input.Clusters.Length, refits.Failed, ImmutableCollectionsMarshal.AsImmutableArray(steps.Deviations))
        {
            LargestDecrement = refits.LargestDecrement,
            Refitted = steps.Failures.Length,
        };
        var (covariance, _) = FromRefits(input, refits with { Deviations = steps.Deviations }, summary, work);
        return (covariance.Matrix is null ? covariance : covariance with
        {
            Cautions =
            [
                "One Newton step stands for each refit; with few clusters full refits can differ from it much.",
                $"Without {Name(input, steps.Failures[0].Cluster)}{(steps.Failures.Length > 1 ? $" (and {steps.Failures.Length - 1} more)" : "")} that step does not exist, "
                + "because the information left is not positive definite: full refits were made there.",
                .. covariance.Cautions,
            ],
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
