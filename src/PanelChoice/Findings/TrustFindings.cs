using PanelChoice.Estimation;

namespace PanelChoice.Findings;

/// <summary>Whether the estimate is to be trusted at all. What else there is to know of the fit stands in its own findings.</summary>
internal static class TrustFindings
{
    public static IEnumerable<Finding> Of(FindingsInput input)
    {
        var model = input.Model;
        if (model.Status != FitStatus.Converged)
            yield return new Finding(
                "fit.untrusted", FindingTopic.Fit, FindingSeverity.Warning,
                $"The estimate is not to be trusted: {Ending(model.Status)}. Standard errors and diagnostics are therefore withheld.", []);
    }

    private static string Ending(FitStatus status) => status switch
    {
        FitStatus.NotIdentified => "some terms cannot be told from these data",
        FitStatus.Separated => "the likelihood rises without end along a direction of the terms, so that no finite estimate exists",
        FitStatus.Boundary => "a dissimilarity runs to the edge of its range, so that no interior maximum exists",
        _ => "the search stopped before it reached a maximum",
    };
}
