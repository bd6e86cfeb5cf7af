using PanelChoice.Covariates;
using PanelChoice.Diagnostics;
using PanelChoice.Inference;

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

        yield return WhatToReport(input, inference);
        if (input.IsCrossSection) yield break;
        if (input.Diagnostics.CommonDays == true)
            yield return new Finding(
                "advice.common_days", FindingTopic.Advice, FindingSeverity.Warning,
                // Simulated for this project: shocks common to a day leave slopes unharmed and make the constants' clustered standard error
                // a third too small; slow ones three times.
                "Clusters of persons do not see what everybody meets on the same day. The constants suffer most: read their intervals as too "
                + "narrow, or add terms for the days themselves.", []);
        foreach (var finding in NotRepaired(input)) yield return finding;
        // Where the covariance is refused for its failures, that is told with the other refusals, and there are no figures to speak of.
        if (inference.Bootstrap is { } bootstrap && bootstrap.Done < bootstrap.Requested
            && inference.Covariances.GetValueOrDefault(CovarianceKind.Bootstrap)?.Matrix is not null)
            yield return new Finding(
                "advice.failed_replicates", FindingTopic.Advice, FindingSeverity.Notice,
                $"{PlainNumber.Count(bootstrap.Requested - bootstrap.Done)} of {PlainNumber.Count(bootstrap.Requested)} bootstrap replicates failed "
                + $"({string.Join(", ", bootstrap.Failures.Select(f => $"{f.Count} {f.Kind}"))}). They are no random sample, so the bootstrap figures lean to the panels that went well.",
                [new FindingFigure("failed", bootstrap.Requested - bootstrap.Done)]);
    }

    private static Finding WhatToReport(FindingsInput input, InferenceResult inference)
    {
        var clusters = inference.Clusters;
        var by = clusters.By == "person" ? "persons" : $"groups of '{clusters.By}'";
        var confidence = PlainNumber.PercentInWords(input.Study.Inference.Confidence);
        if (input.IsCrossSection)
            return new Finding(
                "advice.cross_section", FindingTopic.Advice, FindingSeverity.Information,
                "Every person has one occasion, so occasions are the independent units: report the robust standard error, which stays right when the "
                + "probabilities are not exactly those of the model (Huber 1967, White 1982); the clustered one differs from it by the factor G/(G - 1) alone.", []);
        if (clusters.Count >= FindingsInput.FewClusters)
            return new Finding(
                "advice.cluster", FindingTopic.Advice, FindingSeverity.Information,
                $"Report the clustered standard errors and their {confidence} intervals, from the t distribution with {clusters.DegreesOfFreedom} "
                + $"degrees of freedom. They rest on {PlainNumber.Count(clusters.Count)} {by} and hold whatever ties the occasions inside one together "
                + "(Liang and Zeger 1986; Cameron and Miller 2015); the pooled ones hold only where nothing does.",
                [new FindingFigure("clusters", clusters.Count)]);
        if (clusters.Count < 2)
            return new Finding(
                "advice.one_cluster", FindingTopic.Advice, FindingSeverity.Warning,
                $"All occasions belong to one {(clusters.By == "person" ? "person" : $"group of '{clusters.By}'")}, so nothing here can say how far its occasions hang together, and every "
                + "standard error takes them for independent. The figures speak of that one alone.",
                [new FindingFigure("clusters", clusters.Count)]);
        var few = $"There are only {clusters.Count} {by}: with fewer than {FindingsInput.FewClusters} the clustered standard error tends to be too small.";
        return inference.Covariances.GetValueOrDefault(CovarianceKind.Jackknife)?.Matrix is null
            ? new Finding(
                "advice.few_no_jackknife", FindingTopic.Advice, FindingSeverity.Warning,
                $"{few} The jackknife would be the one to report, but there is none here: call the clustered intervals a lower bound for the uncertainty.",
                [new FindingFigure("clusters", clusters.Count)])
            : new Finding(
                "advice.jackknife", FindingTopic.Advice, FindingSeverity.Notice,
                $"{few} Report the jackknife standard errors with the t distribution with {clusters.DegreesOfFreedom} degrees of freedom "
                + "(MacKinnon, Nielsen and Webb 2023).",
                [new FindingFigure("clusters", clusters.Count)]);
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
