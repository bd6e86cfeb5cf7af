using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Findings;

/// <summary>What the findings are drawn from.</summary>
/// <param name="Study">The study.</param>
/// <param name="Sample">The sample and its book-keeping, and the covariates' names.</param>
/// <param name="Model">The fitted model.</param>
/// <param name="Inference">Standard errors of all kinds, or the reasons why there are none.</param>
/// <param name="Diagnostics">The independence battery.</param>
public sealed record FindingsInput(
    StudySpecification Study, EstimationSample Sample, FittedModel Model, InferenceResult Inference, DiagnosticsResult Diagnostics)
{
    /// <summary>Whether clusters go by their own ids, not by pseudonyms.</summary>
    public bool ShowsIds { get; init; }

    /// <summary>What to report of each free parameter, in layout order.</summary>
    internal ImmutableArray<Recommendation> Recommendations => RecommendationRules.Of(this);

    /// <summary>Tests of terms.</summary>
    public ImmutableArray<TermTestResult> Tests { get; init; } = [];

    /// <summary>Nests against utility maximisation.</summary>
    public ImmutableArray<NestConsistency> UtilityMaximisation { get; init; } = [];

    internal ParameterLayout Layout => Model.Layout;

    /// <summary>The kind of standard error that the sentences quote: clustered, or the jackknife where clusters are not many.</summary>
    internal CovarianceKind Quoted =>
        Inference.Clusters.Count < RecommendationRules.SomeClusters && Inference.Covariances.GetValueOrDefault(CovarianceKind.Jackknife)?.Matrix is not null
            ? CovarianceKind.Jackknife
            : CovarianceKind.Cluster;

    /// <summary>Whether every person has one occasion and is a cluster of its own: then occasions are the independent units.</summary>
    internal bool IsCrossSection => Model.Design.Situations == Model.Design.Persons && Model.Design.Clusters.Length == Model.Design.Persons;

    internal string QuotedInWords => Quoted == CovarianceKind.Jackknife ? "jackknife" : "clustered";

    /// <summary>Whether there is any standard error: not where the estimate is no interior maximum, or every parameter is fixed.</summary>
    internal bool HasErrors => Inference.Covariances.GetValueOrDefault(CovarianceKind.Pooled)?.Matrix is not null;

    internal ParameterInference? InferenceOf(int parameter) => Inference.Parameters.FirstOrDefault(p => p.Parameter == parameter);

    internal KindFigures? Figures(int parameter, CovarianceKind kind) => InferenceOf(parameter)?.ByKind.GetValueOrDefault(kind);

    /// <summary>"1.234 (1.01 to 1.45)", or the value alone where it has no interval.</summary>
    internal string WithInterval(int parameter)
    {
        var value = Model.Parameters[parameter];
        var figures = Figures(parameter, Quoted);
        var decimals = PlainNumber.Decimals(value, figures?.StandardError);
        return figures?.Interval is { } interval
            ? $"{PlainNumber.Text(value, decimals)} ({PlainNumber.Text(interval.Low, decimals)} to {PlainNumber.Text(interval.High, decimals)})"
            : PlainNumber.Text(value, decimals);
    }

    /// <summary>The numbers behind <see cref="WithInterval"/>.</summary>
    internal ImmutableArray<FindingFigure> FiguresOf(int parameter)
    {
        var label = Layout.Parameters[parameter].Label;
        var figures = ImmutableArray.CreateBuilder<FindingFigure>();
        figures.Add(new FindingFigure(label, Model.Parameters[parameter]));
        if (Figures(parameter, Quoted)?.Interval is not { } interval) return figures.ToImmutable();
        figures.Add(new FindingFigure(label + ", low", interval.Low));
        figures.Add(new FindingFigure(label + ", high", interval.High));
        return figures.ToImmutable();
    }

    /// <summary>1 where the interval lies above the value, -1 where below, 0 where it holds it or there is none.</summary>
    internal int SideOf(int parameter, double value) => Figures(parameter, Quoted)?.Interval switch
    {
        { } interval when interval.Low > value => 1,
        { } interval when interval.High < value => -1,
        _ => 0,
    };
}
