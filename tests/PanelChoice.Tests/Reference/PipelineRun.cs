using System.Collections.Concurrent;
using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;

namespace PanelChoice.Tests.Reference;

/// <summary>The real stages on the fixture's own files, from the study file to the standard errors; each case is run once.</summary>
internal sealed record PipelineRun(PipelineSample Sample, FittedModel Model, InferenceResult Inference)
{
    private static readonly WorkContext TwoThreads = new(2, null, CancellationToken.None);
    private static readonly ConcurrentDictionary<string, Lazy<PipelineRun>> Done = new();

    /// <summary>The run without bootstrap.</summary>
    public static PipelineRun Of(string name) => Done.GetOrAdd(name, n => new Lazy<PipelineRun>(() => Run(n, 0))).Value;

    /// <summary>A run with the bootstrap that the study asks for.</summary>
    public static PipelineRun WithBootstrap(string name) => Run(name, null);

    /// <summary>A covariance over the free parameters, rearranged to the order of the expected ones.</summary>
    public double[,] Covariance(CovarianceKind kind, ReferenceCase expected)
    {
        var places = Sample.PlacesIn(expected);
        var estimate = Inference.Covariances[kind];
        Xunit.Assert.True(estimate.Matrix is not null, estimate.Refusal);
        var matrix = new double[places.Length, places.Length];
        for (var r = 0; r < places.Length; r++)
            for (var c = 0; c < places.Length; c++)
                matrix[places[r], places[c]] = estimate.Matrix![r, c];
        return matrix;
    }

    /// <summary>The standard error of each free parameter, in the order of the expected ones.</summary>
    public ImmutableArray<double> StandardErrors(CovarianceKind kind, ReferenceCase expected)
    {
        var places = Sample.PlacesIn(expected);
        var errors = new double[places.Length];
        for (var f = 0; f < places.Length; f++) errors[places[f]] = Inference.Parameters[f].ByKind[kind].StandardError ?? double.NaN;
        return [.. errors];
    }

    private static PipelineRun Run(string name, int? replicates)
    {
        var sample = PipelineSample.Of(name);
        var (form, settings) = (sample.Study.Estimate.Form, sample.Study.Inference);
        var likelihood = LikelihoodKernel.Create(sample.Design, form, TwoThreads.Threads);
        var model = MaximumLikelihood.Fit(likelihood, form, sample.Study.Estimate, TwoThreads);
        var input = InferenceInput.From(model, new ClusterRefitter(model, TwoThreads.Threads)) with
        {
            Second = SecondClusters.Of(sample.Study, EstimationSample.Of(sample.Covariates), model),
        };
        return new PipelineRun(
            sample, model, PanelChoice.Inference.StandardErrors.Compute(input, settings with { Replicates = replicates ?? settings.Replicates }, TwoThreads));
    }
}
