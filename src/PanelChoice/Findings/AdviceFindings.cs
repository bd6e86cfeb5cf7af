using PanelChoice.Covariates;
using PanelChoice.Diagnostics;
using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Findings;

/// <summary>What to report and why, and what a clustered standard error does not repair.</summary>
internal static class AdviceFindings
{
    public static IEnumerable<Finding> Of(FindingsInput input)
    {
        var inference = input.Inference;
        if (!input.HasErrors)
        {
            yield return new Finding(
                "advice.nothing", FindingTopic.Advice, FindingSeverity.Warning,
                input.Layout.Free.IsEmpty
                    ? "Every parameter is fixed by the study, so nothing was estimated: there is no standard error to report."
                    : "Report none of these figures: there is no standard error to go with them. Mend what the fit names above first; leave a term out, join "
                    + "alternatives, or fix a parameter.", []);
            yield break;
        }

        foreach (var finding in WhatToReport(input, inference)) yield return finding;
        if (input.IsCrossSection) yield break;
        if (input.Diagnostics.CommonDays == true)
            yield return new Finding(
                "advice.common_days", FindingTopic.Advice, FindingSeverity.Warning,
                // Simulated for this project: shocks common to a day leave slopes unharmed and make the constants' clustered standard error
                // a third too small; slow ones three times.
                "Clusters of persons do not see what everybody meets on the same day. The constants suffer most: read their intervals as too "
                + "narrow, or add terms for the days themselves.", []);
        foreach (var finding in NotRepaired(input)) yield return finding;
        if (inference.Bootstrap is { Blocks: BootstrapBlocks.Moving } && input.Diagnostics.Cause is DependenceCause.Taste or DependenceCause.HabitAndTaste)
            yield return new Finding(
                "advice.moving_blocks", FindingTopic.Advice, FindingSeverity.Warning,
                // Simulated for this project, 40 persons with 42 occasions and a lasting taste of standard deviation 1: the share of the true spread.
                "Lasting taste was found, and blocks inside persons do not see it: their standard errors are too small. In simulations they came to 0.80 of the true spread for "
                + "an attribute, 0.65 for the last choice and 0.33 for a person's own attribute. Read the clustered ones, or draw whole persons.", []);
        // Where the covariance is refused for its failures, that is told with the other refusals, and there are no figures to speak of.
        if (inference.Bootstrap is { } bootstrap && bootstrap.Done < bootstrap.Requested
            && inference.Covariances.GetValueOrDefault(CovarianceKind.Bootstrap)?.Matrix is not null)
            yield return new Finding(
                "advice.failed_replicates", FindingTopic.Advice, FindingSeverity.Notice,
                $"{PlainNumber.Count(bootstrap.Requested - bootstrap.Done)} of {PlainNumber.Count(bootstrap.Requested)} bootstrap replicates failed "
                + $"({string.Join(", ", bootstrap.Failures.Select(f => $"{f.Count} {f.Kind}"))}). They are no random sample, so the bootstrap figures lean to the panels that went well.",
                [new FindingFigure("failed", bootstrap.Requested - bootstrap.Done)]);
    }

    private static IEnumerable<Finding> WhatToReport(FindingsInput input, InferenceResult inference)
    {
        var clusters = inference.Clusters;
        if (input.IsCrossSection)
        {
            yield return new Finding(
                "advice.cross_section", FindingTopic.Advice, FindingSeverity.Information,
                "Every person has one occasion, so occasions are the independent units: report the robust standard error, which stays right when the "
                + "probabilities are not exactly those of the model (Huber 1967, White 1982); the clustered one differs from it by the factor G/(G - 1) alone.", []);
            yield break;
        }

        if (clusters.Count < 2)
        {
            yield return new Finding(
                "advice.one_cluster", FindingTopic.Advice, FindingSeverity.Warning,
                $"All occasions belong to one {(clusters.By == "person" ? "person" : $"group of '{clusters.By}'")}, so nothing here can say how far its occasions hang together, and every "
                + "standard error takes them for independent. The figures speak of that one alone.",
                [new FindingFigure("clusters", clusters.Count)]);
            yield break;
        }

        var groups = input.Recommendations.GroupBy(r => (r.Kind, r.Rule, r.Why)).ToList();
        foreach (var group in groups)
        {
            var terms = groups.Count == 1 ? "" : $" of {Named(input, [.. group.Select(r => r.Parameter)])}";
            if (group.Key.Kind is not { } kind)
            {
                yield return new Finding("advice.no_error", FindingTopic.Advice, FindingSeverity.Warning, $"There is no standard error{terms} to report. {group.Key.Why}", []);
                continue;
            }

            // Where the rules would have had another and there is none, the clustered one with few clusters bounds the uncertainty from below.
            var isBound = kind == CovarianceKind.Cluster && clusters.Count < RecommendationRules.SomeClusters;
            yield return new Finding(
                isBound ? "advice.lower_bound" : "advice." + PrecisionFindings.IdOf(kind), FindingTopic.Advice,
                isBound ? FindingSeverity.Warning : kind == CovarianceKind.Cluster ? FindingSeverity.Information : FindingSeverity.Notice,
                $"Report the {PrecisionFindings.InWords(kind)} standard error{(groups.Count == 1 ? " of every term" : terms)} with {Distribution(group)}. {group.Key.Why}"
                + (isBound ? " Call its interval a lower bound for the uncertainty." : ""),
                [new FindingFigure("clusters", clusters.Count)]);
        }
    }

    /// <summary>The terms of a group, the first few by name.</summary>
    private static string Named(FindingsInput input, IReadOnlyList<int> parameters)
    {
        const int Most = 4;
        var names = parameters.Take(Most).Select(k => $"'{input.Layout.Parameters[k].Label}'").ToList();
        return parameters.Count > Most ? $"{string.Join(", ", names)} and {parameters.Count - Most} more"
            : names.Count == 1 ? names[0]
            : $"{string.Join(", ", names[..^1])} and {names[^1]}";
    }

    private static string Distribution(IEnumerable<Recommendation> group)
    {
        var distinct = group.Select(r => r.DegreesOfFreedom).Distinct().ToList();
        return distinct.Count > 1 ? "t distributions, each with its own degrees of freedom"
            : distinct[0] is { } df ? $"the t distribution with {PlainNumber.Count(df)} degrees of freedom"
            : "the normal distribution";
    }

    private static IEnumerable<Finding> NotRepaired(FindingsInput input)
    {
        if (input.Diagnostics.Verdict != Verdict.Dependence || input.Diagnostics.Cause is null) yield break;
        var hasHabit = input.Layout.Parameters.Any(p => p.Role == CovariateRole.PastChoice);
        // Lags that jump gaps shrank a true habit of 0.80 to 0.68 in simulations made for this project, where lasting taste swells it.
        var jumpsGaps = input.Sample.Cautions.Any(c => c.Id == "history.gaps");
        yield return new Finding(
            "advice.not_repaired", FindingTopic.Advice, FindingSeverity.Warning,
            hasHabit
                ? "The clustered standard error repairs the interval, not the estimate: with dependence left in the model the habit coefficient itself can "
                + "be too large, and the other coefficients too near to 0. "
                + (jumpsGaps
                    ? "Lags that jump a gap pull it the other way, so it bounds nothing before the history rule is settled."
                    : "Treat it as an upper bound until a model that holds lasting taste agrees.")
                : "The clustered standard error repairs the interval, not the model: the dependence found is a part of behaviour that the terms leave out. "
                + "Try a term that looks back, such as last_choice = 1 with past_share = true beside it.", []);
    }
}
