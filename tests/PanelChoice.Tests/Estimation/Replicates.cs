using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Optimisation;
using PanelChoice.Study;
using PanelChoice.Tests.Support;

namespace PanelChoice.Tests.Estimation;

/// <summary>A fitted model, requests to refit it, and how far a refit is from its maximum.</summary>
internal sealed class Replicates
{
    private readonly ColumnSurvey survey;
    private readonly ExactRefit exact;

    public Replicates(ChoiceDesign design, NestedLogitForm form = NestedLogitForm.UtilityScaled)
        : this(Fits.Fit(design, form, 2))
    {
    }

    /// <exception cref="ArgumentException">The model is at no maximum, so that there is nothing to refit.</exception>
    public Replicates(FittedModel model)
    {
        if (model.Status != FitStatus.Converged) throw new ArgumentException($"The fit ended as {model.Status}.", nameof(model));
        Model = model;
        survey = Model.Survey!;
        exact = new ExactRefit(Model, Model.Likelihood, survey);
    }

    public FittedModel Model { get; }

    private int Clusters => Model.Design.Clusters.Length;

    /// <summary>Bootstrap replicates.</summary>
    public ImmutableArray<RefitRequest> Draws(int count, long seed = 5) =>
        [.. Enumerable.Range(0, count).Select(r => new RefitRequest(ClusterDraw.Weights(seed, r, Clusters), Model.Parameters, []))];

    /// <summary>Refits without one cluster each.</summary>
    public ImmutableArray<RefitRequest> Deletions(int count) =>
        [.. Enumerable.Range(0, count).Select(g => new RefitRequest([.. Enumerable.Range(0, Clusters).Select(c => c == g ? 0.0 : 1)], Model.Parameters, []))];

    /// <summary>What goes side by side alone: null where exact Newton steps would have to find out.</summary>
    public RefitOutcome?[] SideBySide(ImmutableArray<RefitRequest> requests, double tolerance, long mostEntries = ClusterExpansion.MostEntries, int threads = 1)
    {
        var likelihood = LikelihoodKernel.Create(Model.Design, Model.Form, threads);
        var expansion = ClusterExpansion.Of(Model, likelihood, survey.Scale, mostEntries, CancellationToken.None)!;
        return new BatchedRefits(expansion, Model, likelihood, tolerance)
            .Run([.. requests.Select(r => PreparedRefit.Of(Model, r))], threads, CancellationToken.None);
    }

    /// <summary>The refit by exact Newton steps.</summary>
    public RefitOutcome Exact(RefitRequest request)
    {
        var prepared = PreparedRefit.Of(Model, request);
        return exact.WithoutEvidence(prepared) ?? exact.Run(prepared, CancellationToken.None);
    }

    /// <summary>Requests with evidence on every parameter.</summary>
    public ImmutableArray<RefitRequest> Told(ImmutableArray<RefitRequest> requests) =>
        [.. requests.Where(r => exact.WithoutEvidence(PreparedRefit.Of(Model, r)) is null)];

    /// <summary>
    /// The distance of a refit from its maximum, in its own pooled standard errors (clones of a cluster counted one by one), measured by exact Newton
    /// steps from it until nothing but rounding is left; NaN where they do not end at a maximum.
    /// </summary>
    public double Distance(RefitRequest request, RefitOutcome outcome)
    {
        var prepared = PreparedRefit.Of(Model, request);
        var function = new MinusLogLikelihood(Model.Likelihood, prepared.PersonWeight, survey.Scale, prepared.Active, outcome.Parameters.AsSpan());
        var from = function.Coordinates(outcome.Parameters.AsSpan());
        var end = TrustRegionNewton.Minimise(function.Evaluate, from, new MinimisationSettings(Tolerance: 0));
        if (!(end.IsMinimum && end.Decrement < 1e-8)) return double.NaN;
        double[] away = [.. from.Zip(end.Point, (a, b) => a - b)];
        var squared = SymmetricProduct.Of(end.At.Hessian, away).Zip(away, (h, a) => h * a).Sum();
        var sampling = MinusLogLikelihood.MeanWeight(Model.Design, [.. Model.Design.PersonWeight]);
        return Math.Sqrt(Math.Max(0, squared * Math.Max(1, function.Unit / sampling)));
    }

    /// <summary>A panel with two nests.</summary>
    public static SyntheticPanel Panel(int seed, int persons, int occasions, double one = 0.6, double two = 0.7, double tasteSd = 0.3) => SyntheticPanel.Make(
        seed, persons, occasions, 4, [SyntheticPanel.Nest("one", "A", "B"), SyntheticPanel.Nest("two", "C", "D")], [one, two], habit: 0.5, tasteSd: tasteSd);
}
