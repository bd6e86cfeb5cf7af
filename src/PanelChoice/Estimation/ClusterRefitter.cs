using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Optimisation;

namespace PanelChoice.Estimation;

/// <summary>
/// Full refits of a fitted model under other cluster weights: exact Newton from the request's start, usually three or four steps. Requests run
/// side by side, each on one thread and each seeing only itself, so that outcomes have the same bits for any number of threads and any batch.
/// A request whose clusters no longer tell a parameter (its column does not vary among them, goes one way only, its nest is never two wide)
/// fails by name before anything is fitted; one that ends nowhere is tried again from other starts.
/// </summary>
public sealed class ClusterRefitter : IRefitter
{
    /// <summary>Below this decrement the last Newton step is taken without another evaluation: its error is of the order of 1e-10 standard errors.</summary>
    private static readonly MinimisationSettings Warm = new(UncheckedLastStep: 1e-5, MaxIterations: 100);

    private readonly FittedModel model;
    private readonly IChoiceLikelihood likelihood;
    private readonly ColumnSurvey survey;
    private readonly StartingPoints points;
    private readonly double samplingWeight;
    private readonly int threads;

    /// <summary>A refitter of a model.</summary>
    /// <param name="model">The fitted model.</param>
    /// <param name="threads">Threads, 1 or more; no figure depends on it.</param>
    public ClusterRefitter(FittedModel model, int threads)
    {
        ArgumentNullException.ThrowIfNull(model);
        ArgumentOutOfRangeException.ThrowIfLessThan(threads, 1);
        this.model = model;
        this.threads = threads;
        likelihood = LikelihoodKernel.Create(model.Design, model.Form, 1);
        survey = model.Survey ?? ColumnSurvey.Of(model.Design, threads);
        points = new StartingPoints(model.Design, model.Form);
        samplingWeight = MinusLogLikelihood.MeanWeight(model.Design, [.. model.Design.PersonWeight]);
    }

    /// <inheritdoc/>
    /// <exception cref="ArgumentException">A request's lengths do not fit the model, or a weight is negative or not finite.</exception>
    public ImmutableArray<RefitOutcome> Refit(ImmutableArray<RefitRequest> batch, CancellationToken cancellation)
    {
        foreach (var request in batch) Validate(request);
        var outcomes = new RefitOutcome[batch.Length];
        if (threads == 1 || batch.Length == 1)
        {
            for (var i = 0; i < batch.Length; i++) outcomes[i] = Refit(batch[i], cancellation);
        }
        else
        {
            Parallel.For(
                0, batch.Length, new ParallelOptions { MaxDegreeOfParallelism = threads, CancellationToken = cancellation },
                i => outcomes[i] = Refit(batch[i], cancellation));
        }

        return ImmutableCollectionsMarshal.AsImmutableArray(outcomes);
    }

    private RefitOutcome Refit(RefitRequest request, CancellationToken cancellation)
    {
        cancellation.ThrowIfCancellationRequested();
        var design = model.Design;
        var layout = design.Layout;
        var weight = new double[design.Persons];
        for (var p = 0; p < weight.Length; p++) weight[p] = design.PersonWeight[p] * request.ClusterWeight[design.ClusterOf[p]];
        var start = request.Start.ToArray();
        for (var k = 0; k < start.Length; k++) start[k] = layout.Parameters[k].Fixed ?? start[k];
        ImmutableArray<int> active = [.. layout.Free.Except(model.Held).Except(request.Held)];

        if (WithoutEvidence(request, active, weight) is { } failure)
        {
            var at = likelihood.Evaluate(start, weight, Derivatives.None);
            return new RefitOutcome(failure.Status, [.. start], at.Value, 0, false, KindOf(failure.Status), failure.About);
        }

        var search = new LocalSearch(likelihood, model.Form, weight, survey.Scale, cancellation);
        var best = search.Run(start, active, Warm, []);
        var iterations = best.Iterations;
        var retried = false;
        if (best.Kind is SearchEndKind.Boundary or SearchEndKind.Stopped)
        {
            foreach (var from in OtherStarts(start, active, search))
            {
                var end = search.Run(from, active, Warm, []);
                iterations += end.Iterations;
                if (!IsBetter(end, best)) continue;
                (best, retried) = (end, true);
                if (end.Kind is SearchEndKind.Maximum or SearchEndKind.Separated) break;
            }
        }

        var (status, about) = Judge(best, active, weight);
        return new RefitOutcome(status, [.. best.Parameters], best.LogLikelihood, iterations, retried, KindOf(status), about)
        {
            Decrement = status == FitStatus.Converged ? best.Last.Decrement * InSamplingUnits(weight) : double.NaN,
        };
    }

    /// <summary>
    /// A search measures decrements with the request's weights scaled to mean 1 over the situations that count. In a draw with replacement the clones
    /// count too, so that its pooled standard errors are smaller: there the sampling weights alone are scaled.
    /// </summary>
    private double InSamplingUnits(double[] weight) =>
        Math.Sqrt(Math.Max(1, MinusLogLikelihood.MeanWeight(model.Design, weight) / samplingWeight));

    /// <summary>A maximum beats what stopped anywhere and a boundary that is not above it; otherwise the higher point wins.</summary>
    private static bool IsBetter(SearchEnd end, SearchEnd best) => (end.Kind, best.Kind) switch
    {
        (SearchEndKind.Maximum, SearchEndKind.Stopped) => true,
        (SearchEndKind.Maximum, _) => end.LogLikelihood >= best.LogLikelihood - (1e-9 * Math.Abs(best.LogLikelihood)),
        _ => end.LogLikelihood > best.LogLikelihood && end.Kind != SearchEndKind.Stopped,
    };

    /// <summary>Parameters that the clusters with positive weight cannot tell, seen column by column.</summary>
    private (FitStatus Status, ImmutableArray<int> About)? WithoutEvidence(RefitRequest request, ImmutableArray<int> active, double[] weight)
    {
        var layout = model.Design.Layout;
        var evidence = survey.Of(request.ClusterWeight.AsSpan());
        var isScaled = model.Form == Study.NestedLogitForm.UtilityScaled;
        ImmutableArray<int> silent = [.. active.Where(k => (isScaled || layout.Nests.IsEmpty) && !evidence[k].HasFlag(Evidence.Varies))];
        if (!silent.IsEmpty) return (FitStatus.NotIdentified, silent);
        var oneSided = Separation.OneSided(model.Design, model.Form, evidence, active, weight);
        return oneSided.IsEmpty ? null : (FitStatus.Separated, oneSided);
    }

    /// <summary>The estimate of the whole sample, a jittered start, plain logit, and half the dissimilarities.</summary>
    private IEnumerable<double[]> OtherStarts(double[] start, ImmutableArray<int> active, LocalSearch search)
    {
        double[] Hold(double[] at)
        {
            var held = (double[])start.Clone();
            foreach (var k in active) held[k] = at[k];
            return held;
        }

        var full = Hold([.. model.Parameters]);
        if (!full.AsSpan().SequenceEqual(start)) yield return full;
        yield return Hold(Jittered(start, active));
        ImmutableArray<int> coefficients = [.. active.Where(k => k < model.Layout.Coefficients)];
        foreach (var common in new[] { 1.0, 0.5, 0.2 })
        {
            if (common < 1 && points.Free.IsEmpty) yield break;
            var from = Hold(points.With(start, [.. points.Free.Select(_ => common)]));
            var given = search.Run(from, coefficients, Warm with { UncheckedLastStep = 0, Tolerance = 0.03 }, []);
            yield return given.Kind == SearchEndKind.Maximum ? given.Parameters : from;
        }
    }

    private double[] Jittered(double[] start, ImmutableArray<int> active)
    {
        var random = new CounterRandom(0, "refit jitter", 0);
        var at = (double[])start.Clone();
        foreach (var k in active)
        {
            var z = MathNet.Numerics.Distributions.Normal.Sample(random, 0, 1);
            at[k] = k < model.Layout.Coefficients
                ? ((at[k] * survey.Scale[k] * (1 + (0.2 * z))) + (0.1 * z)) / survey.Scale[k]
                : at[k] * Math.Exp(0.3 * z);
        }

        return at;
    }

    private (FitStatus Status, ImmutableArray<int> About) Judge(SearchEnd end, ImmutableArray<int> active, double[] weight)
    {
        switch (end.Kind)
        {
            case SearchEndKind.Separated: return (FitStatus.Separated, end.About);
            case SearchEndKind.Boundary: return (FitStatus.Boundary, end.About);
            case SearchEndKind.Stopped: return (FitStatus.Stopped, []);
            default:
                var function = new MinusLogLikelihood(likelihood, weight, survey.Scale, active, end.Parameters);
                var curvature = Curvature.Of(likelihood, function, end.Last.At, end.Parameters, weight);
                return curvature.IsIdentified ? (FitStatus.Converged, []) : (FitStatus.NotIdentified, curvature.Weakest);
        }
    }

    private static string? KindOf(FitStatus status) => status switch
    {
        FitStatus.Converged => null,
        FitStatus.NotIdentified => "not identified",
        FitStatus.Separated => "separated",
        FitStatus.Boundary => "boundary",
        _ => "stopped",
    };

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
