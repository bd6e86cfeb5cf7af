using System.Collections.Immutable;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Optimisation;

namespace PanelChoice.Estimation;

/// <summary>
/// A refit by exact Newton steps, and the judge of what it came to: it names what is not identified, separated or at a boundary. A request whose clusters no
/// longer tell a parameter (its column does not vary among them, goes one way only, its nest is never two wide) fails by name before anything is fitted; one that
/// ends nowhere is tried again from other starts.
/// </summary>
internal sealed class ExactRefit
{
    /// <summary>Below this decrement the last Newton step is taken without another evaluation: its error is of the order of 1e-10 standard errors.</summary>
    private static readonly MinimisationSettings Warm = new(UncheckedLastStep: 1e-5, MaxIterations: 100);

    /// <summary>Jittered starts after a failure, and common dissimilarities from which coefficients are found first (1 is plain logit).</summary>
    private const int Jitters = 2;

    private static readonly double[] DissimilarityGrid = [1.0, 0.75, 0.5, 0.35, 0.2];

    private readonly FittedModel model;
    private readonly IChoiceLikelihood likelihood;
    private readonly ColumnSurvey survey;
    private readonly StartingPoints points;
    private readonly double samplingWeight;

    /// <summary>Refits of a model.</summary>
    /// <param name="model">The model.</param>
    /// <param name="likelihood">Its likelihood, on one thread.</param>
    /// <param name="survey">What is known of each column by itself.</param>
    public ExactRefit(FittedModel model, IChoiceLikelihood likelihood, ColumnSurvey survey)
    {
        this.model = model;
        this.likelihood = likelihood;
        this.survey = survey;
        points = new StartingPoints(model.Design, model.Form);
        samplingWeight = MinusLogLikelihood.MeanWeight(model.Design, [.. model.Design.PersonWeight]);
    }

    /// <summary>The failure of a request whose clusters cannot tell a parameter; null where nothing stands against fitting it.</summary>
    public RefitOutcome? WithoutEvidence(PreparedRefit refit)
    {
        if (Untold(refit) is not { } failure) return null;
        var at = likelihood.Evaluate(refit.Start, refit.PersonWeight, Derivatives.None);
        return new RefitOutcome(failure.Status, [.. refit.Start], at.Value, 0, false, KindOf(failure.Status), failure.About);
    }

    /// <summary>Refits a request that has evidence on every parameter.</summary>
    public RefitOutcome Run(PreparedRefit refit, CancellationToken cancellation)
    {
        cancellation.ThrowIfCancellationRequested();
        var (_, active, weight, start) = refit;

        var search = new LocalSearch(likelihood, model.Form, weight, survey.Scale, cancellation);
        var best = search.Run(start, active, Warm, []);
        var iterations = best.Iterations;
        var retried = false;
        if (best.Kind is SearchEndKind.Boundary or SearchEndKind.Stopped)
        {
            foreach (var from in OtherStarts(refit, search))
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
    private (FitStatus Status, ImmutableArray<int> About)? Untold(PreparedRefit refit)
    {
        var (request, active, weight, _) = refit;
        var layout = model.Design.Layout;
        var evidence = survey.Of(request.ClusterWeight.AsSpan());
        var isScaled = model.Form == Study.NestedLogitForm.UtilityScaled;
        ImmutableArray<int> silent = [.. active.Where(k => (isScaled || layout.Nests.IsEmpty) && !evidence[k].HasFlag(Evidence.Varies))];
        if (!silent.IsEmpty) return (FitStatus.NotIdentified, silent);
        var oneSided = Separation.OneSided(model.Design, model.Form, evidence, active, weight);
        return oneSided.IsEmpty ? null : (FitStatus.Separated, oneSided);
    }

    /// <summary>The estimate of the whole sample, jittered starts from the request's own stream, plain logit, and a grid of common dissimilarities.</summary>
    private IEnumerable<double[]> OtherStarts(PreparedRefit refit, LocalSearch search)
    {
        var (start, active) = (refit.Start, refit.Active);

        double[] Hold(double[] at)
        {
            var held = (double[])start.Clone();
            foreach (var k in active) held[k] = at[k];
            return held;
        }

        var full = Hold([.. model.Parameters]);
        if (!full.AsSpan().SequenceEqual(start)) yield return full;
        var random = new CounterRandom(refit.Request.Number, "refit jitter", 0);
        for (var i = 0; i < Jitters; i++) yield return Hold(Jittered(start, active, random));
        ImmutableArray<int> coefficients = [.. active.Where(k => k < model.Layout.Coefficients)];
        foreach (var common in DissimilarityGrid)
        {
            if (common < 1 && points.Free.IsEmpty) yield break;
            var from = Hold(points.With(start, [.. points.Free.Select(_ => common)]));
            var given = search.Run(from, coefficients, Warm with { UncheckedLastStep = 0, Tolerance = 0.03 }, []);
            yield return given.Kind == SearchEndKind.Maximum ? given.Parameters : from;
        }
    }

    private double[] Jittered(double[] start, ImmutableArray<int> active, CounterRandom random)
    {
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
}
