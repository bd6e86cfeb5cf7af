using PanelChoice.Estimation;

namespace PanelChoice.Inference;

/// <summary>What a failed refit is called.</summary>
internal static class FailureKinds
{
    /// <summary>The refitter's own word, or the status in plain words.</summary>
    public static string Of(RefitOutcome outcome) => outcome.FailureKind ?? outcome.Status switch
    {
        FitStatus.NotIdentified => "not identified",
        FitStatus.Separated => "separated",
        FitStatus.Boundary => "dissimilarity at the edge of its range",
        FitStatus.Converged => "not finite",
        _ => "not converged",
    };
}
