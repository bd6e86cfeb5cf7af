using PanelChoice.Findings;
using PanelChoice.Results;

namespace PanelChoice.Cli.Report;

/// <summary>How the estimation went.</summary>
internal static class FitSection
{
    public static void AddTo(Letter letter, AnalysisResult result)
    {
        var fit = result.Fit;
        var nested = result.Parameters.Any(p => p.Kind == ParameterResult.Dissimilarity);
        var estimatesNests = result.Parameters.Any(p => p.Kind == ParameterResult.Dissimilarity && p.IsFree);
        letter.Paragraph(
            (nested ? $"Nested logit, {fit.Form} form" : "Plain logit") + $", {PlainNumber.Counted(fit.FreeParameters, "free parameter")}, by maximum likelihood. "
            + Ending(fit, estimatesNests));
        letter.Gap();
        letter.Table(
            [new TableColumnPlan("log-likelihood", IsNumber: false), new TableColumnPlan("")],
            new[] { ("at the estimate", fit.LogLikelihood), ("with constants alone", fit.LogLikelihoodConstants), ("all offered equally likely", fit.LogLikelihoodEqualProbability) }
                .Select(x => new[] { x.Item1, x.Item2 is { } value ? PlainNumber.Text(value, 3) : "none" }));
        EstimateReport.Say(letter, result, FindingTopic.Fit, gapFirst: true);
        if (fit.Warnings.IsEmpty) return;
        letter.Gap();
        letter.Paragraphs(fit.Warnings.Select(w => (w.Sentence, false)));
    }

    private static string Ending(FitSummary fit, bool estimatesNests)
    {
        if (fit.Status != FitSummary.Converged) return $"It ended as '{fit.Status.Replace('_', ' ')}'.";
        if (!estimatesNests && fit.Starts.Converged == 1) return "One start was enough, as there is no dissimilarity to estimate; it converged.";
        var starts = fit.Starts;
        var where = starts.Optima.Length > 1 ? "not all at the same maximum" : "all at the same maximum";
        return starts.Requested <= 1
            ? "The one start from plain logit converged."
            : $"{PlainNumber.Count(starts.Converged)} of {PlainNumber.Counted(starts.Requested, "start")} converged, {where}.";
    }
}
