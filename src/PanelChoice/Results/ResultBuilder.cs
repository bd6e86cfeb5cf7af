using System.Collections.Immutable;
using System.Reflection;
using System.Runtime.InteropServices;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Results;

/// <summary>Gathers what the stages made into one result.</summary>
internal static class ResultBuilder
{
    public static AnalysisResult Build(FindingsInput stages, ImmutableArray<Finding> findings)
    {
        var (study, sample, model, inference, diagnostics) = stages;
        var book = new ReasonBook();
        var entries = ParameterEntries.Of(model);
        var fit = Fit(model, book);
        var parameters = entries.Select((e, i) => ParameterEntries.Figures(e, $"parameters[{i}]", model, inference, book)).ToImmutableArray();
        var covariance = CovarianceExpansion.Over(entries, inference, book);
        var bootstrap = BootstrapEntries.Of(entries, study.Inference, model.Layout, inference, book);
        var jackknife = Jackknife(inference, book);
        var twoWay = TwoWayResult.Of(inference, [.. model.Layout.Parameters.Select(p => p.Label)], book);
        var clusters = Clusters(stages, book);
        TestsJson.NoteReasons(stages.Tests, book);
        UtilityJson.NoteReasons(stages.UtilityMaximisation, book);
        NoteDiagnostics(diagnostics, book);
        return new AnalysisResult(
            study.Title,
            new ToolStamp(Version, RuntimeInformation.FrameworkDescription, model.Likelihood.Kernel),
            Inputs(study, sample.File, sample.Sha256),
            new RunSettings(study.Inference.Confidence, study.Estimate.Seed, study.Inference.BootstrapSeed, study.Diagnostics.Seed),
            book.Reasons,
            Warnings(sample, inference, findings),
            Sample(sample, model.Design),
            fit,
            parameters,
            bootstrap,
            jackknife,
            covariance,
            clusters,
            diagnostics,
            findings,
            Replicates(entries, model, inference.Bootstrap))
        {
            TwoWay = twoWay,
            Recommendations = RecommendationResult.Of(stages.Recommendations, model.Layout),
            Tests = stages.Tests,
            UtilityMaximisation = stages.UtilityMaximisation,
        };
    }

    /// <summary>Version of the program, without the revision that a build may append.</summary>
    public static string Version { get; } =
        typeof(ResultBuilder).Assembly.GetCustomAttribute<AssemblyInformationalVersionAttribute>()!.InformationalVersion.Split('+')[0];

    /// <summary>The input stamps; folders are left out of the study's name, because they tell about the machine and not about the study.</summary>
    public static InputStamps Inputs(StudySpecification study, string dataFile, string dataSha256) =>
        new(new FileStamp(Path.GetFileName(study.File), study.Sha256), new FileStamp(dataFile, dataSha256));

    private static SampleSummary Sample(EstimationSample sample, ChoiceDesign design) =>
        sample.Persons == design.Persons && sample.Occasions == design.Situations
            ? SampleSummary.Of(sample)
            : throw new InvalidOperationException("The design and the covariates hold different samples.");

    private static FitSummary Fit(FittedModel model, ReasonBook book) => new(
        ParameterEntries.StatusWord(model.Status),
        model.Form == NestedLogitForm.Unscaled ? "unscaled" : "utility-scaled",
        book.Number("fit.log_likelihood", model.LogLikelihood, "The search left the range of finite numbers."),
        book.Number("fit.log_likelihood_equal_probability", model.LogLikelihoodEqualProbability, "It is not finite."),
        book.Number("fit.log_likelihood_constants", model.LogLikelihoodConstants, "With constants alone the likelihood has no maximum."),
        model.Layout.Free.Length,
        book.Number("fit.gradient_norm", model.GradientNorm, "Without standard errors the gradient cannot be scaled."),
        model.Iterations,
        new StartCounts(model.StartsRequested, model.StartsConverged, [.. model.Optima.Select(o => new OptimumCount(o.LogLikelihood, o.Starts))]),
        [.. model.Findings.Select(f => new FitWarning(f.Id, f.Sentence, [.. f.Parameters.Select(k => model.Layout.Parameters[k].Label)]))]);

    private static JackknifeCounts? Jackknife(InferenceResult inference, ReasonBook book)
    {
        if (inference.Jackknife is not { } summary)
        {
            book.Note("jackknife", ParameterEntries.KindReason(CovarianceKind.Jackknife, inference));
            return null;
        }

        var isOneStep = summary.Kind == JackknifeKind.OneStep;
        return new JackknifeCounts(isOneStep ? "one_step" : "refit", summary.Refits, summary.Failures)
        {
            LargestDecrement = book.Number(
                "jackknife.largest_decrement", summary.LargestDecrement,
                isOneStep ? "One Newton step stands for each refit." : "No refit converged."),
            Refitted = isOneStep ? summary.Refitted : summary.Refits,
        };
    }

    private const string NoShare = "Without a maximum no cluster has a share in the information.", OneCluster = "There is one cluster only.";

    private static ClusterResult Clusters(FindingsInput stages, ReasonBook book)
    {
        var clusters = stages.Inference.Clusters;
        var design = stages.Model.Design;
        return new ClusterResult(
            clusters.By, clusters.Count, book.Number("clusters.effective", clusters.Effective, clusters.EffectiveReason ?? "It is not computed."),
            clusters.Smallest, clusters.Median, clusters.Largest, clusters.DegreesOfFreedom,
            [.. clusters.MostInfluential.Select(
                i => new InfluenceResult($"{clusters.By} {clusters.Names[i.Cluster]}", design.Layout.Parameters[i.Parameter].Label, i.Change))])
        {
            LargestLeverage = book.Number("clusters.leverage.largest", clusters.LargestLeverage, NoShare),
            LeverageSpread = book.Number("clusters.leverage.spread", clusters.LeverageSpread, clusters.Count < 2 ? OneCluster : NoShare),
            SizeSpread = book.Number("clusters.size_spread", clusters.SizeSpread, OneCluster),
            InfluenceFrom = Known(clusters.InfluenceFrom switch
            {
                JackknifeKind.OneStep => "one_step",
                null => null,
                _ => "refit",
            }),
        };

        string? Known(string? from)
        {
            if (from is null) book.Note("clusters.influence_from", "No estimate without a single cluster exists.");
            return from;
        }
    }

    private static ImmutableArray<ResultWarning> Warnings(EstimationSample sample, InferenceResult inference, ImmutableArray<Finding> findings) =>
    [
        .. sample.Cautions.Select(c => new ResultWarning(c.Id, c.Sentence))
            .Concat(Enum.GetValues<CovarianceKind>().Where(inference.Covariances.ContainsKey).SelectMany(
                k => inference.Covariances[k].Cautions.Select(c => new ResultWarning("inference." + JsonWords.Of(k), c))))
            .Concat(findings.Where(f => f.Severity == FindingSeverity.Warning).Select(f => new ResultWarning(f.Id, f.Sentence)))
            .Distinct(),
    ];

    private static void NoteDiagnostics(DiagnosticsResult diagnostics, ReasonBook book)
    {
        var none = diagnostics.Reason ?? "It could not be computed on this panel.";
        if (diagnostics.Detector is null) book.Note("diagnostics.detector", none);
        if (diagnostics.DateScore is null)
            book.Note("diagnostics.date_score", diagnostics.Reason ?? "The study does not say that an occasion is the same day for everybody, or no day is shared.");
        if (diagnostics.CommonDays is null) book.Note("diagnostics.common_days", diagnostics.Reason ?? "The date score was not computed.");
        if (diagnostics.Cause is null) book.Note("diagnostics.cause", diagnostics.Verdict == Verdict.Dependence ? "Only the date score passed." : "No dependence was found.");
        book.Number("diagnostics.variance_inflation", diagnostics.VarianceInflation, none);
        if (diagnostics.HitRate is null) book.Note("diagnostics.hit_rate", "There is no cause whose rule could be rated.");
        book.Note("diagnostics.bootstrap", "The parametric bootstrap of the detector is not in this version; its p-value is analytic.");
        for (var i = 0; i < diagnostics.Lags.Length; i++)
        {
            const string Thin = "Too few pairs of occasions lie at this distance.";
            book.Number($"diagnostics.lags[{i}].gamma", diagnostics.Lags[i].Gamma, Thin);
            book.Number($"diagnostics.lags[{i}].se", diagnostics.Lags[i].StandardError, Thin);
        }

        for (var i = 0; i < diagnostics.ByAlternative.Length; i++)
            book.Number($"diagnostics.by_alternative[{i}].z", diagnostics.ByAlternative[i].Z, "The alternative is chosen or offered too seldom.");
        for (var i = 0; i < diagnostics.ByNest.Length; i++)
            book.Number($"diagnostics.by_nest[{i}].z", diagnostics.ByNest[i].Z, "The nest is chosen or offered too seldom.");
        for (var i = 0; i < (diagnostics.Detector?.ByDecay.Length ?? 0); i++)
            book.Number($"diagnostics.detector.by_decay[{i}].z", diagnostics.Detector!.ByDecay[i].Z, "The score has no variance at this decay.");
    }

    private static ReplicateTable Replicates(ImmutableArray<ParameterEntry> entries, FittedModel model, BootstrapSummary? bootstrap)
    {
        var labels = ColumnNames.Distinct(
            entries.Select(e => e.Standing is null ? model.Layout.Parameters[e.Parameter].Label : e.Name), ReplicatesParquet.FixedColumns);
        if (bootstrap is null) return new ReplicateTable(labels, [], [], []);
        var estimates = new double[bootstrap.Requested * entries.Length];
        for (var r = 0; r < bootstrap.Requested; r++)
            for (var i = 0; i < entries.Length; i++)
                estimates[(r * entries.Length) + i] = entries[i].Value(bootstrap.Estimates.AsSpan(r * model.Layout.Count, model.Layout.Count));
        return new ReplicateTable(labels, bootstrap.Status, bootstrap.LogLikelihood, ImmutableCollectionsMarshal.AsImmutableArray(estimates))
        {
            Decrement = bootstrap.Decrement,
            FailedParameters = BootstrapEntries.FailedByReplicate(bootstrap, model.Layout),
        };
    }
}
