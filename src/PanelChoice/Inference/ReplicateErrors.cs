using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>Scores by cluster and information of the sample at other parameters and cluster weights.</summary>
/// <param name="Scores">G x F: sum of each cluster's scores under the sampling weights alone, row by row.</param>
/// <param name="Information">F x F: minus the Hessian under sampling and cluster weights.</param>
public sealed record ReplicateEvidence(ImmutableArray<double> Scores, ImmutableArray<double> Information);

/// <summary>
/// The clustered standard error of every replicate: sqrt of the diagonal of G/(G-1) H*^-1 (sum w_g s*_g s*_g') H*^-1, scores and information at the replicate's own
/// estimate and weights, a cluster drawn w times being w clusters. It takes one pass for scores and one for the Hessian for each replicate.
/// </summary>
internal static class ReplicateErrors
{
    /// <summary>
    /// Situations times replicates up to which they are made unasked: a few seconds of one thread. Beyond that they cost several times what the
    /// replicates themselves do, whose first steps are shared.
    /// </summary>
    public const long MostUnasked = 20_000_000;

    /// <summary>Why there are none; null when they are to be made.</summary>
    public static string? Obstacle(InferenceInput input, InferenceSettings settings, BootstrapSummary bootstrap) =>
        bootstrap.Draw != BootstrapDraw.Counts ? "A replicate with exponential weights has no clusters of its own whose scores could give it a standard error."
        : bootstrap.Blocks != BootstrapBlocks.Cluster ? "Replicates that draw blocks of occasions or days have no clusters whose scores could give them a standard error."
        : settings.Studentised == false ? "The study switches it off: studentised = false."
        : input.Evidence is null ? "This likelihood gives no scores at other parameters."
        : settings.Studentised is null && (long)input.Contributions * bootstrap.Requested > MostUnasked
            ? "It needs two more passes over this large sample for each replicate; studentised = true under [inference.bootstrap] asks for them."
        : null;

    /// <summary>The standard errors.</summary>
    /// <param name="input">The fit.</param>
    /// <param name="weights">Weights of a replicate's clusters, by its number.</param>
    /// <param name="bootstrap">The replicates.</param>
    /// <param name="work">Threads, progress, cancellation; no bit depends on them.</param>
    /// <returns>Requested x F; NaN where a replicate failed or its information is not positive definite.</returns>
    public static ImmutableArray<double> Of(InferenceInput input, Func<int, ImmutableArray<double>> weights, BootstrapSummary bootstrap, WorkContext work)
    {
        var f = input.Free.Length;
        var k = input.Estimates.Length;
        var errors = new double[bootstrap.Requested * f];
        Array.Fill(errors, double.NaN);
        var sharesThreads = input.Contributions >= VectorNestedLogit.SituationsForThreads;
        var batch = sharesThreads ? 1 : NumberedRefits.BatchPerThread * Math.Max(1, work.Threads);
        for (var first = 0; first < bootstrap.Requested; first += batch)
        {
            work.Report("standard errors of replicates", first, bootstrap.Requested);
            var end = Math.Min(first + batch, bootstrap.Requested);
            Parallel.For(
                first, end,
                new ParallelOptions { MaxDegreeOfParallelism = sharesThreads ? 1 : Math.Max(1, work.Threads), CancellationToken = work.Cancellation },
                r =>
                {
                    if (double.IsNaN(bootstrap.LogLikelihood[r])) return;
                    var drawn = weights(r);
                    Fill(errors.AsSpan(r * f, f), input.Evidence!(bootstrap.Estimates.Slice(r * k, k), drawn), drawn);
                });
        }

        work.Report("standard errors of replicates", bootstrap.Requested, bootstrap.Requested);
        return ImmutableCollectionsMarshal.AsImmutableArray(errors);
    }

    /// <summary>What a fitted model has to say at other parameters.</summary>
    public static ReplicateEvidence At(FittedModel model, ImmutableArray<double> parameters, ImmutableArray<double> clusterWeight)
    {
        var design = model.Design;
        var free = model.Layout.Free;
        var f = free.Length;
        var k = model.Layout.Count;
        var drawn = new double[design.Persons];
        var weight = new double[design.Persons];
        for (var p = 0; p < design.Persons; p++)
        {
            var cluster = clusterWeight[design.ClusterOf[p]];
            weight[p] = design.PersonWeight[p] * cluster;
            drawn[p] = cluster > 0 ? design.PersonWeight[p] : 0;
        }

        var byPerson = model.Likelihood.SumScores(parameters.AsSpan(), drawn).ByPerson;
        var scores = new double[design.Clusters.Length * f];
        for (var p = 0; p < design.Persons; p++)
            for (var i = 0; i < f; i++) scores[(design.ClusterOf[p] * f) + i] += byPerson[(p * k) + free[i]];
        var hessian = model.Likelihood.Evaluate(parameters.AsSpan(), weight, Derivatives.Hessian).Hessian;
        return new ReplicateEvidence(
            ImmutableCollectionsMarshal.AsImmutableArray(scores), [.. free.SelectMany(r => free.Select(c => -hessian[(r * k) + c]))]);
    }

    private static void Fill(Span<double> errors, ReplicateEvidence evidence, ImmutableArray<double> drawn)
    {
        var f = errors.Length;
        if (ScaledCholesky.Factor(evidence.Information.AsSpan(), f, out _)?.Inverse() is not { } bread) return;
        for (var k = 0; k < f; k++)
        {
            var sum = 0.0;
            for (var g = 0; g < drawn.Length; g++)
            {
                if (drawn[g] == 0) continue;
                var influence = 0.0;
                for (var c = 0; c < f; c++) influence += bread[(k * f) + c] * evidence.Scores[(g * f) + c];
                sum += drawn[g] * influence * influence;
            }

            errors[k] = Math.Sqrt(sum * drawn.Length / (drawn.Length - 1.0));
        }
    }
}
