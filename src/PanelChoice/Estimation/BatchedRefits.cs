using System.Collections.Immutable;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Optimisation;

namespace PanelChoice.Estimation;

/// <summary>
/// Refits side by side: each read of the data serves all of them. A replicate's figures depend on its own request alone, so that they are the same bits
/// in any company; the company only shares the reading.
/// </summary>
/// <param name="expansion">The clusters' log-likelihoods around the full estimate.</param>
/// <param name="model">The fitted model.</param>
/// <param name="likelihood">Its likelihood.</param>
/// <param name="tolerance">Distance from its maximum, in its own pooled standard errors, at which a replicate stops.</param>
internal sealed class BatchedRefits(ClusterExpansion expansion, FittedModel model, IChoiceLikelihood likelihood, double tolerance)
{
    /// <summary>Replicates that share a read of the data. More bring nothing further, and their weights would crowd the cache.</summary>
    public const int Together = 32;

    private readonly IReplicateLikelihood passes = SeparatePasses.Of(likelihood);
    private readonly double samplingWeight = MinusLogLikelihood.MeanWeight(model.Design, [.. model.Design.PersonWeight]);

    /// <summary>One outcome for each request; null where exact Newton steps have to find out.</summary>
    /// <param name="requests">Requests that start from the full estimate.</param>
    /// <param name="threads">Threads for the sums at the start, 1 or more.</param>
    /// <param name="cancellation">Stops between chunks of the data.</param>
    public RefitOutcome?[] Run(IReadOnlyList<PreparedRefit> requests, int threads, CancellationToken cancellation)
    {
        var starts = expansion.At([.. requests.Select(r => r.Request.ClusterWeight)], threads);
        var searches = new ReplicateSearch[requests.Count];
        FixedChunks.Run(searches.Length, threads, (_, first, end) =>
        {
            for (var r = first; r < end; r++) searches[r] = Begin(requests[r], starts[r]);
        });

        var waiting = new Queue<ReplicateSearch>(searches);
        var atWork = new List<ReplicateSearch>();
        while (true)
        {
            atWork.RemoveAll(s => s.Next is null);
            while (atWork.Count < Together && waiting.TryDequeue(out var search))
                if (search.Next is not null) atWork.Add(search);
            if (atWork.Count == 0) break;
            var at = passes.Gradients([.. atWork.Select(s => s.Next!)], cancellation);
            for (var i = 0; i < at.Length; i++) atWork[i].Take(at[i]);
        }

        return [.. searches.Select(s => s.Outcome)];
    }

    private ReplicateSearch Begin(PreparedRefit refit, ReplicateStart start)
    {
        var function = new MinusLogLikelihood(likelihood, refit.PersonWeight, expansion.Scale, refit.Active, model.Parameters.AsSpan());
        var here = function.InCoordinates(model.Parameters.AsSpan(), start.At);
        var local = new CubicModel(here.Gradient, here.Hessian, Third(refit.Active), function.Situations);
        return new ReplicateSearch(
            function, model.Parameters.AsSpan(), local, refit.PersonWeight, Math.Sqrt(Math.Max(1, function.Unit / samplingWeight)), start.HessianError, tolerance);
    }

    /// <summary>Third derivatives by the parameters that move.</summary>
    private double[] Third(ImmutableArray<int> active)
    {
        var n = expansion.Active.Length;
        if (active.Length == n) return expansion.Third;
        int[] place = [.. active.Select(k => expansion.Active.IndexOf(k))];
        return [.. place.SelectMany(k => place.SelectMany(i => place.Select(j => expansion.Third[(((k * n) + i) * n) + j])))];
    }
}
