using PanelChoice.Estimation;

namespace PanelChoice.Findings;

/// <summary>How the estimation ended, and whether its maximum is the only one.</summary>
internal static class FitFindings
{
    public static IEnumerable<Finding> Of(FindingsInput input)
    {
        var model = input.Model;
        if (model.Status != FitStatus.Converged)
            yield return new Finding(
                "fit.untrusted", FindingTopic.Fit, FindingSeverity.Warning,
                $"The estimate is not to be trusted: {Ending(model.Status)}. Standard errors and diagnostics are therefore withheld.", []);
        if (model.Optima.Length > 1)
        {
            var best = model.Optima[0];
            var next = model.Optima[1];
            yield return new Finding(
                "fit.several_maxima", FindingTopic.Fit, FindingSeverity.Notice,
                $"The likelihood has {PlainNumber.Counted(model.Optima.Length, "distinct maximum").Replace("maximums", "maxima", StringComparison.Ordinal)}; "
                + $"the best was reached from {PlainNumber.Counted(best.Starts, "start")}, the next one lies "
                + $"{PlainNumber.Ratio(best.LogLikelihood - next.LogLikelihood)} lower. All are listed in result.json.",
                [new FindingFigure("maxima", model.Optima.Length), new FindingFigure("difference", best.LogLikelihood - next.LogLikelihood)]);
        }
    }

    private static string Ending(FitStatus status) => status switch
    {
        FitStatus.NotIdentified => "some terms cannot be told from these data",
        FitStatus.Separated => "the likelihood rises without end along a direction of the terms, so that no finite estimate exists",
        FitStatus.Boundary => "a dissimilarity runs to the edge of its range, so that no interior maximum exists",
        _ => "the search stopped before it reached a maximum",
    };
}
