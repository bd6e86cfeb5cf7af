namespace PanelChoice.Findings;

/// <summary>What is said whatever the figures are.</summary>
internal static class CautionFindings
{
    public static IEnumerable<Finding> Of(FindingsInput input)
    {
        if (input.Sample.IsWeighted)
            yield return new Finding(
                "caution.weights", FindingTopic.Caution, FindingSeverity.Notice,
                "Sampling weights enter as given; ratios of standard errors use weights scaled to mean 1.", []);
        yield return new Finding(
            "caution.interval", FindingTopic.Caution, FindingSeverity.Information,
            "A clustered standard error repairs the interval, not a biased habit coefficient.", []);
        yield return new Finding(
            "caution.personal_data", FindingTopic.Caution, input.ShowsIds ? FindingSeverity.Warning : FindingSeverity.Information,
            "Records of where people travel are personal data: handle them as local law asks. "
            + (input.ShowsIds
                ? "This result names persons by their ids, as --show-ids asked for: do not pass it on."
                : "Persons are shown here under pseudonyms; whoever holds the data file can undo them."), []);
        yield return new Finding(
            "caution.forecast", FindingTopic.Caution, FindingSeverity.Information,
            "A forecast for a public decision needs the review of somebody qualified to give it.", []);
    }
}
