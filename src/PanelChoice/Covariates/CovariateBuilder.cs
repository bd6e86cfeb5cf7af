using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Data;
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
        var problems = new List<Problem>();
        var planned = Plan(study, panel, study.Terms, problems);
        if (problems.Count > 0) return Checked<CovariateSet>.Bad([.. problems]);

        var history = new OccasionHistory(panel, study.History);
        var values = new TermValues(panel, tree, history);
        var (used, leftOut) = SampleSelection.Select(panel, history, study.History, planned, values);
        return used.IsEmpty
            ? Checked<CovariateSet>.Bad([EmptySample(panel, leftOut)])
            : new CovariateFiller(study, panel, history, values, study.Terms, used).Fill(planned, leftOut);
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
        var problems = new List<Problem>();
        var planned = Plan(study, panel, terms, problems);
        if (used.IsEmpty) problems.Add(EmptySample(panel, []));
        if (problems.Count > 0) return Checked<CovariateSet>.Bad([.. problems]);

        var history = new OccasionHistory(panel, study.History);
        var values = new TermValues(panel, tree, history);
        var outside = panel.Occasions - used.Length;
        ImmutableArray<LeftOut> leftOut = outside > 0 ? [new LeftOut("not in the given sample", outside)] : [];
        return new CovariateFiller(study, panel, history, values, terms, used).Fill(planned, leftOut);
    }

    private static ImmutableArray<PlannedTerm> Plan(
        StudySpecification study, ChoicePanel panel, ImmutableArray<TermSpecification> terms, List<Problem> problems)
    {
        CheckRule(study, panel, terms, problems);
        var planned = new TermPlanner(study, panel, problems).Plan(terms);
        problems.AddRange(LogarithmCheck.Problems(panel, planned));
        return planned;
    }

    private static void CheckRule(StudySpecification study, ChoicePanel panel, ImmutableArray<TermSpecification> terms, List<Problem> problems)
    {
        var needsRule = terms.FirstOrDefault(t => TermDirection.StepsBack(t.Source) is not null || TermDirection.StepsAhead(t.Source) is not null);
        if (study.History.Previous is null && needsRule is not null)
            problems.Add(new Problem(
                "study.no_previous", study.File, $"term '{needsRule.Name}' looks at another occasion, and [history] does not say which is the previous one",
                "state previous = \"recorded\", \"step\", \"day\", \"workday\" or \"week\"")
            {
                Line = needsRule.Line,
            });
        var pairs = (study.History.Previous, panel.Table.OccasionKind) switch
        {
            (PreviousRule.Step, OccasionKind.Date) => "counts whole numbers, and the occasions are dates",
            (PreviousRule.Day or PreviousRule.Workday or PreviousRule.Week, OccasionKind.WholeNumber) => "counts dates, and the occasions are whole numbers",
            _ => null,
        };
        if (pairs is null) return;
        var rule = study.History.Previous.ToString()!.ToLowerInvariant();
        var remedy = panel.Table.OccasionKind == OccasionKind.Date ? "use \"recorded\", \"day\", \"workday\" or \"week\"" : "use \"recorded\" or \"step\"";
        problems.Add(new Problem("study.previous_does_not_fit", study.File, $"previous = \"{rule}\" {pairs}", remedy));
    }

    private static Problem EmptySample(ChoicePanel panel, ImmutableArray<LeftOut> leftOut)
    {
        var reasons = leftOut.IsEmpty
            ? ""
            : ": " + string.Join("; ", leftOut.Select(l => string.Create(CultureInfo.InvariantCulture, $"{l.Occasions} {l.Reason}")));
        return new Problem(
            "sample.empty", panel.Table.File, "no occasion is left to estimate from" + reasons,
            "let the terms look back less far, choose another previous, or state without_history = \"zero\"");
    }
}
