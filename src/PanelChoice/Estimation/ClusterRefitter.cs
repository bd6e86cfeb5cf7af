using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Likelihood;

namespace PanelChoice.Estimation;

/// <summary>
/// Full refits of a fitted model under other cluster weights. Requests that start from the full estimate go side by side (<see cref="BatchedRefits"/>), each
/// read of the data serving many of them; what does not settle there, looks like anything but an ordinary maximum, or starts elsewhere goes by exact
/// Newton steps from its start (<see cref="ExactRefit"/>), which also find the kinds of failure. A request sees only itself either way, so that outcomes have
/// the same bits for any number of threads and any batch.
/// </summary>
public sealed class ClusterRefitter : IRefitter
{
    /// <summary>
    /// How close to its maximum, in its own pooled standard errors, a replicate must be on a large sample, and on one below <see cref="VectorNestedLogit.SituationsForThreads"/>
    /// situations, where the two passes more that it takes cost less than a millisecond and replicates then agree with any other way of finding them to 8 digits.
    /// </summary>
    internal const double Tolerance = 1e-5, ToleranceOfSmall = 1e-9;

    private readonly FittedModel model;
    private readonly IChoiceLikelihood likelihood;
    private readonly ColumnSurvey survey;
    private readonly ExactRefit exact;
    private readonly int threads;
    private readonly bool isSmall;
    private readonly long mostEntries;
    private readonly Lock expanding = new();
    private BatchedRefits? batched;
    private bool isExpanded;

    /// <summary>A refitter of a model.</summary>
    /// <param name="model">The fitted model.</param>
    /// <param name="threads">Threads, 1 or more; no figure depends on it.</param>
    public ClusterRefitter(FittedModel model, int threads)
        : this(model, threads, ClusterExpansion.MostEntries)
    {
    }

    /// <summary>A refitter of a model that may hold so many doubles for first steps.</summary>
    internal ClusterRefitter(FittedModel model, int threads, long mostEntries)
    {
        ArgumentNullException.ThrowIfNull(model);
        ArgumentOutOfRangeException.ThrowIfLessThan(threads, 1);
        this.model = model;
        this.threads = threads;
        this.mostEntries = mostEntries;
        isSmall = model.Design.Situations < VectorNestedLogit.SituationsForThreads;
        likelihood = LikelihoodKernel.Create(model.Design, model.Form, 1);
        survey = model.Survey ?? ColumnSurvey.Of(model.Design, threads);
        exact = new ExactRefit(model, likelihood, survey);
    }

    /// <inheritdoc/>
    /// <exception cref="ArgumentException">A request's lengths do not fit the model, or a weight is negative or not finite.</exception>
    public ImmutableArray<RefitOutcome> Refit(ImmutableArray<RefitRequest> batch, CancellationToken cancellation)
    {
        foreach (var request in batch) Validate(request);
        cancellation.ThrowIfCancellationRequested();
        var refits = new PreparedRefit[batch.Length];
        var outcomes = new RefitOutcome?[batch.Length];
        Each(batch.Length, i =>
        {
            refits[i] = PreparedRefit.Of(model, batch[i]);
            outcomes[i] = exact.WithoutEvidence(refits[i]);
        }, cancellation);

        int[] together = [.. Enumerable.Range(0, batch.Length).Where(i => outcomes[i] is null && !refits[i].Active.IsEmpty && StartsFromEstimate(batch[i]))];
        if (together.Length > 0 && Batched(cancellation) is { } side) SideBySide(side, refits, together, outcomes, cancellation);
        int[] left = [.. Enumerable.Range(0, batch.Length).Where(i => outcomes[i] is null)];
        Each(left.Length, i => outcomes[left[i]] = exact.Run(refits[left[i]], cancellation), cancellation);
        return ImmutableCollectionsMarshal.AsImmutableArray(outcomes)!;
    }

    /// <summary>On a small sample threads share the requests; on a large one they share each pass.</summary>
    private void SideBySide(BatchedRefits side, PreparedRefit[] refits, int[] which, RefitOutcome?[] outcomes, CancellationToken cancellation)
    {
        var groups = isSmall ? Math.Min(threads, which.Length) : 1;
        Each(groups, group =>
        {
            int[] own = [.. which.Where((_, i) => i % groups == group)];
            var found = side.Run([.. own.Select(i => refits[i])], isSmall ? 1 : threads, cancellation);
            for (var i = 0; i < own.Length; i++) outcomes[own[i]] = found[i];
        }, cancellation);
    }

    private void Each(int count, Action<int> action, CancellationToken cancellation)
    {
        if (threads == 1 || count <= 1)
        {
            for (var i = 0; i < count; i++) action(i);
        }
        else
        {
            Parallel.For(0, count, new ParallelOptions { MaxDegreeOfParallelism = threads, CancellationToken = cancellation }, action);
        }
    }

    private bool StartsFromEstimate(RefitRequest request) => model.Status == FitStatus.Converged && request.Start.AsSpan().SequenceEqual(model.Parameters.AsSpan());

    /// <summary>Made when the first request comes that it can serve; null where too many clusters would have to be held.</summary>
    private BatchedRefits? Batched(CancellationToken cancellation)
    {
        lock (expanding)
        {
            if (!isExpanded)
            {
                var shared = LikelihoodKernel.Create(model.Design, model.Form, threads);
                if (ClusterExpansion.Of(model, shared, survey.Scale, mostEntries, cancellation) is { } expansion)
                    batched = new BatchedRefits(expansion, model, shared, isSmall ? ToleranceOfSmall : Tolerance);
                isExpanded = true;
            }

            return batched;
        }
    }

    private void Validate(RefitRequest request)
    {
        if (request.ClusterWeight.Length != model.Design.Clusters.Length)
            throw new ArgumentException($"A request has {request.ClusterWeight.Length} cluster weights for {model.Design.Clusters.Length} clusters.");
        if (request.Start.Length != model.Layout.Count)
            throw new ArgumentException($"A request starts from {request.Start.Length} values for {model.Layout.Count} parameters.");
        foreach (var w in request.ClusterWeight)
            if (!(w >= 0) || double.IsInfinity(w)) throw new ArgumentException("A cluster weight is negative or not finite.");
    }
}
