using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>
/// Turns the study's terms into covariates: lagged choices and attributes, habit stocks, means, indicators. History is read from the recorded
/// panel and before any resampling, so that a bootstrap joint never invents a false yesterday.
/// </summary>
public static class CovariateBuilder
{
    /// <summary>Selects the estimation sample and builds the covariates of the study's terms on it.</summary>
    /// <param name="study">The study.</param>
    /// <param name="panel">The recorded panel.</param>
    /// <param name="tree">The nest tree over the panel's alternatives (own nests for <c>last_nest</c>).</param>
    /// <returns>The covariates, or every problem of the terms with the data; an empty sample is a problem that says why.</returns>
    public static Checked<CovariateSet> Build(StudySpecification study, ChoicePanel panel, NestTree tree)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(panel);
        ArgumentNullException.ThrowIfNull(tree);
        var survey = new CovariateSurvey(study, study.Terms);
        var leftOut = new LeftOutBook();
        if (!survey.Plan(panel)) return Checked<CovariateSet>.Bad(survey.Problems);
        var part = new SampleSelector(study, tree).Select(panel, leftOut)!;
        return part.Used.IsEmpty
            ? Checked<CovariateSet>.Bad([EmptySample(panel.Table.File, leftOut.Reasons)])
            : Fill(survey, part, leftOut.Reasons);
    }

    /// <summary>
    /// Builds the covariates of other terms on a sample that is already decided, so that two models compared in one run use the same occasions.
    /// </summary>
    /// <param name="study">The study, for its history rule.</param>
    /// <param name="panel">The recorded panel.</param>
    /// <param name="tree">The nest tree over the panel's alternatives.</param>
    /// <param name="terms">The terms to build.</param>
    /// <param name="used">The occasions of the sample, ascending.</param>
    /// <returns>The covariates, or problems; a term that lacks its history on the given sample is one under <see cref="MissingHistory.Drop"/>.</returns>
    public static Checked<CovariateSet> BuildOn(
        StudySpecification study, ChoicePanel panel, NestTree tree, ImmutableArray<TermSpecification> terms, ImmutableArray<int> used)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(panel);
        ArgumentNullException.ThrowIfNull(tree);
        var survey = new CovariateSurvey(study, terms);
        survey.Plan(panel);
        if (used.IsEmpty) survey.Reject(EmptySample(panel.Table.File, []));
        if (!survey.Problems.IsEmpty) return Checked<CovariateSet>.Bad(survey.Problems);
        var outside = panel.Occasions - used.Length;
        var history = new OccasionHistory(panel, study.History);
        var part = new SamplePart(panel, history, new TermValues(panel, tree, history), used);
        return Fill(survey, part, outside > 0 ? [new LeftOut("not in the given sample", outside)] : []);
    }

    private static Checked<CovariateSet> Fill(CovariateSurvey survey, SamplePart part, ImmutableArray<LeftOut> leftOut)
    {
        var all = survey.Add(part);
        survey.CountGaps(part);
        return survey.Finish(leftOut).Then(outline => Checked<CovariateSet>.Good(new CovariateSet(
            part.Panel, part.Used, [.. all.Covariates.Where(c => outline.Keeps(c))], leftOut, outline.StockStarts, outline.Cautions)));
    }

    /// <summary>The problem of a sample in which nothing is left.</summary>
    internal static Problem EmptySample(string file, ImmutableArray<LeftOut> leftOut)
    {
        var reasons = leftOut.IsEmpty
            ? ""
            : ": " + string.Join("; ", leftOut.Select(l => string.Create(CultureInfo.InvariantCulture, $"{l.Occasions} {l.Reason}")));
        return new Problem(
            "sample.empty", file, "no occasion is left to estimate from" + reasons,
            "let the terms look back less far, choose another previous, or state without_history = \"zero\"");
    }
}
