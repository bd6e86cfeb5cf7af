namespace PanelChoice.Inference;

/// <summary>
/// Robust: V = H^-1 (sum s_it s_it') H^-1 without a small-sample factor (Huber 1967; White 1982). Each occasion counts by itself, so it
/// allows for a wrong model but not for dependence between a person's occasions.
/// </summary>
internal static class RobustCovariance
{
    /// <summary>The estimate.</summary>
    /// <param name="input">What is known of the model.</param>
    /// <param name="bread">H^-1, F x F.</param>
    /// <param name="meat">sum s_it s_it', F x F.</param>
    public static CovarianceEstimate Estimate(InferenceInput input, double[] bread, ReadOnlySpan<double> meat)
    {
        if (input.Contribution == ContributionKind.Person)
            return CovarianceEstimate.Refused(
                CovarianceKind.Robust, "The likelihood is integrated over each person, so a single occasion has no score of its own.");
        var f = input.Free.Length;
        return CovarianceEstimate.Of(CovarianceKind.Robust, Sandwich.Of(bread, meat, 1, f), f, 1, null, []);
    }
}
