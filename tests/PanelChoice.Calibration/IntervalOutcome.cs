using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Calibration;

/// <summary>What became of one panel.</summary>
/// <param name="Status">How the fit ended.</param>
/// <param name="Verdicts">
/// For each interval kind, one letter for each of <see cref="Terms"/>: 'c' where the interval covers the value of the scenario, 'm' where it misses it,
/// '-' where there is no interval.
/// </param>
internal sealed record IntervalOutcome(string Status, ImmutableSortedDictionary<string, string> Verdicts)
{
    /// <summary>The terms that are watched: the habit term, the person-level dummy, a dissimilarity.</summary>
    public static readonly ImmutableArray<string> Terms = ["same as last time", "pass", "first"];

    private const double Confidence = 0.95;

    /// <summary>Makes and judges a panel.</summary>
    public static IntervalOutcome Of(IntervalScenario scenario, int persons, int index, IntervalOptions options)
    {
        var made = scenario.Panel(persons, options.Seed, index);
        var model = IntervalScenario.Fit(made);
        if (model.Status != FitStatus.Converged) return new IntervalOutcome(model.Status.ToString(), ImmutableSortedDictionary<string, string>.Empty);
        var study = made.Study with
        {
            Inference = made.Study.Inference with
            {
                Confidence = Confidence, Jackknife = JackknifeKind.Refit, Replicates = options.Replicates, BootstrapSeed = index, SecondCluster = "occasion",
            },
        };
        var evidence = InferenceInput.From(model, new ClusterRefitter(model, 1)) with { Second = SecondClusters.Of(study, EstimationSample.Of(made.Covariates), model) };
        var inference = StandardErrors.Compute(evidence, study.Inference, WorkContext.Quiet);
        var places = Terms.Select(t => model.Layout.Parameters.Select((p, k) => (p.Name, k)).First(x => x.Name == t).k).ToArray();
        var terms = places.Select(k => inference.Parameters.First(p => p.Parameter == k)).ToArray();
        var verdicts = ImmutableSortedDictionary.CreateBuilder<string, string>(StringComparer.Ordinal);
        foreach (var kind in Enum.GetValues<CovarianceKind>()) Add(kind.ToString(), p => p.ByKind.GetValueOrDefault(kind)?.Interval);
        Add("Percentile", p => p.BootstrapPercentile);
        var diagnostics = IndependenceBattery.Run(study, made.Covariates, model, WorkContext.Quiet);
        var recommended = new FindingsInput(study, EstimationSample.Of(made.Covariates), model, inference, diagnostics).Recommendations.ToDictionary(r => r.Parameter);
        Add("recommended", p => recommended[p.Parameter].Interval);
        return new IntervalOutcome("Converged", verdicts.ToImmutable());

        void Add(string kind, Func<ParameterInference, Interval?> interval)
        {
            var letters = string.Concat(terms.Select((p, i) => interval(p) is not { } at ? '-' : at.Low <= scenario.Limit[places[i]] && scenario.Limit[places[i]] <= at.High ? 'c' : 'm'));
            if (letters.Any(c => c != '-')) verdicts[kind] = letters;
        }
    }

    /// <summary>The outcome as a line of a restart file.</summary>
    public string Written => $"{Status};{string.Join(';', Verdicts.Select(v => $"{v.Key}={v.Value}"))}";

    /// <summary>Reads such a line.</summary>
    public static IntervalOutcome Parse(string written)
    {
        var parts = written.Split(';', StringSplitOptions.RemoveEmptyEntries);
        return new IntervalOutcome(parts[0], parts.Skip(1).Select(p => p.Split('=')).ToImmutableSortedDictionary(p => p[0], p => p[1], StringComparer.Ordinal));
    }
}
