using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Estimation;
using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>Delete-one-cluster estimates by full refits.</summary>
/// <param name="Deviations">G x F: th_(g) - th; NaN where a term was not identified without the cluster, or the refit failed.</param>
/// <param name="Failed">Clusters whose plain refit failed, rescued by holding a term or not.</param>
/// <param name="Lost">Term by term (place among the free ones), the clusters without which it is not identified, with the kind of failure.</param>
/// <param name="Hopeless">Clusters without which nothing could be estimated, with the kind of failure.</param>
/// <param name="LargestDecrement">The largest certificate among the refits that converged; null where none did.</param>
internal sealed record JackknifeRefits(
    double[] Deviations, int Failed, SortedDictionary<int, List<(int Cluster, string Kind)>> Lost, List<(int Cluster, string Kind)> Hopeless,
    double? LargestDecrement)
{
    /// <summary>
    /// Refits without each cluster, warm-started from the full estimate. Where a refit finds terms that are not identified (or run to the
    /// edge of their range) without the cluster, those terms are lost for the jackknife, and the others are estimated once more with them
    /// held at their full-sample values, so that one person cannot take the figures of every term away.
    /// </summary>
    /// <param name="input">What is known of the model.</param>
    /// <param name="only">The clusters to leave out, one at a time.</param>
    /// <param name="work">Threads, progress, cancellation.</param>
    public static JackknifeRefits Run(InferenceInput input, IReadOnlyList<int> only, WorkContext work)
    {
        var clusters = input.Clusters.Length;
        var f = input.Free.Length;
        var deviations = new double[clusters * f];
        Array.Fill(deviations, double.NaN);
        var lost = new SortedDictionary<int, List<(int, string)>>();
        var hopeless = new List<(int, string)>();
        var failed = new HashSet<int>();
        double? largest = null;
        var pending = only.Select(g => new Deletion(g, [], [])).ToList();
        while (pending.Count > 0)
        {
            var again = new List<Deletion>();
            var outcomes = Outcomes(input, pending, work);
            for (var i = 0; i < pending.Count; i++)
            {
                var deletion = pending[i];
                var outcome = outcomes[i];
                if (outcome.Status == FitStatus.Converged && input.Free.All(k => double.IsFinite(outcome.Parameters[k])))
                {
                    for (var k = 0; k < f; k++)
                        if (!deletion.Lost.Contains(input.Free[k]))
                            deviations[(deletion.Cluster * f) + k] = outcome.Parameters[input.Free[k]] - input.Estimates[input.Free[k]];
                    largest = Math.Max(largest ?? 0, outcome.Decrement);
                    continue;
                }

                failed.Add(deletion.Cluster);
                var kind = FailureKinds.Of(outcome);
                if (deletion.WithFailure(outcome, input) is not { } next)
                {
                    hopeless.Add((deletion.Cluster, kind));
                    continue;
                }

                foreach (var parameter in next.Lost.Except(deletion.Lost))
                {
                    var place = input.Free.IndexOf(parameter);
                    if (!lost.TryGetValue(place, out var at)) lost[place] = at = [];
                    at.Add((deletion.Cluster, kind));
                }

                again.Add(next);
            }

            pending = again;
        }

        return new JackknifeRefits(deviations, failed.Count, lost, hopeless, largest);
    }

    /// <summary>The plain refit without a cluster.</summary>
    public static RefitRequest Without(InferenceInput input, int cluster) => new Deletion(cluster, [], []).Request(input);

    /// <summary>The first round is the numbered series; refits that hold something are asked for once its failures are known.</summary>
    private static ImmutableArray<RefitOutcome> Outcomes(InferenceInput input, List<Deletion> pending, WorkContext work)
    {
        if (pending.All(d => d.Held.IsEmpty))
            return NumberedRefits.Make(input, RefitSeries.Jackknife, [.. pending.Select(d => d.Cluster)], g => Without(input, g), work);
        return
        [
            .. pending.Chunk(NumberedRefits.Batch(input, work))
                .SelectMany(batch => input.Refitter.Refit([.. batch.Select(d => d.Request(input))], work.Cancellation)),
        ];
    }

    /// <summary>One cluster left out; parameters by their index in the layout.</summary>
    private sealed record Deletion(int Cluster, ImmutableArray<int> Held, ImmutableArray<int> Lost)
    {
        public RefitRequest Request(InferenceInput input)
        {
            var weights = new double[input.Clusters.Length];
            Array.Fill(weights, 1);
            weights[Cluster] = 0;
            return new RefitRequest(ImmutableCollectionsMarshal.AsImmutableArray(weights), input.Estimates, Held) { Number = Cluster };
        }

        /// <summary>The same deletion with failed terms held; null when that cannot help.</summary>
        public Deletion? WithFailure(RefitOutcome outcome, InferenceInput input)
        {
            var named = outcome.FailedParameters.Where(k => input.Free.Contains(k) && !Held.Contains(k)).ToImmutableArray();
            if (named.IsEmpty) return null;
            var next = outcome.Status switch
            {
                // Terms that cannot be told from each other: holding one of them gives the rest of the model its estimates back, whatever the value.
                FitStatus.NotIdentified => new Deletion(Cluster, Held.Add(named[^1]), [.. Lost.Union(named)]),
                FitStatus.Separated or FitStatus.Boundary => new Deletion(Cluster, [.. Held.Union(named)], [.. Lost.Union(named)]),
                _ => null,
            };
            return next is null || input.Free.All(next.Held.Contains) ? null : next;
        }
    }
}
