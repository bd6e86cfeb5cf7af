using PanelChoice.Covariates;
using PanelChoice.Findings;
using PanelChoice.Panels;
using PanelChoice.Results;
using PanelChoice.Study;

namespace PanelChoice.Cli.Report;

/// <summary>Who is in a panel, for how long, with which gaps, who ever switches; and what an estimation would use of it.</summary>
internal static class ProfileReport
{
    // Wider tables of counts do not fit into 80 columns; the file that --json writes has them whole.
    private const int WidestTransitions = 7;
    private const int LongestHeading = 9;

    /// <summary>Puts the report together.</summary>
    /// <param name="study">The study.</param>
    /// <param name="profile">The panel's profile.</param>
    /// <param name="input">What an estimation would start from.</param>
    public static Letter Of(StudySpecification study, PanelProfile profile, PanelAnalysisInput input)
    {
        var letter = new Letter()
            .Title(study.Title.Length > 0 ? study.Title : Path.GetFileName(study.File))
            .Subtitle($"study {Path.GetFileName(study.File)}, data {study.Panel.File}: no problem found");
        letter.Heading("The recorded panel");
        letter.Paragraph(Length(profile));
        if (profile.Gaps is { } gaps) letter.Gap().Paragraph(Gaps(gaps));
        if (profile.Weights is { } weights)
            letter.Gap().Paragraph(
                $"Weights ('{weights.Column}'): from {PlainNumber.Rounded(weights.Smallest, null)} to {PlainNumber.Rounded(weights.Largest, null)} over persons, "
                + $"mean {PlainNumber.Rounded(weights.Mean, null)}.");
        if (profile.Clusters.By != "person")
            letter.Gap().Paragraph(
                $"Clusters ('{profile.Clusters.By}'): {PlainNumber.Count(profile.Clusters.Count)}; occasions in one: {Range(profile.Clusters.Occasions)}.");
        letter.Heading("What is offered and chosen");
        Alternatives(letter, profile);
        if (profile.LastChoice is { } last) LastChoice(letter, profile, last, input.Panel);
        letter.Heading("What an estimation would use");
        SampleSection.AddTo(letter, SampleSummary.Of(EstimationSample.Of(input.Covariates)));
        var cautions = profile.Cautions.Concat(input.Covariates.Cautions).DistinctBy(c => c.Sentence).ToList();
        if (cautions.Count == 0) return letter;
        letter.Heading("To look at before going on");
        return letter.Paragraphs(cautions.Select(c => (c.Sentence, false)));
    }

    private static string Length(PanelProfile profile)
    {
        var text = $"{PlainNumber.Counted(profile.Rows, "row")}, {PlainNumber.Counted(profile.Occasions, "occasion")}, {PlainNumber.Counted(profile.Persons, "person")}";
        if (profile.FirstOccasion is { } first) text += $", from {first} to {profile.LastOccasion}";
        text += $". Occasions of a person: {Range(profile.OccasionsPerPerson)}. Alternatives offered on an occasion: {Range(profile.OfferedAlternatives)}";
        return text + (profile.SingleAlternativeOccasions > 0
            ? $"; {PlainNumber.Counted(profile.SingleAlternativeOccasions, "occasion")} with a single one can only serve as history."
            : ".");
    }

    private static string Gaps(GapProfile gaps)
    {
        var unit = Unit(gaps.Unit.ToString());
        return gaps.Count == 0
            ? $"There is no gap: neighbouring records are never more than {PlainNumber.Counted(gaps.Step, unit)} apart."
            : $"{PlainNumber.Counted(gaps.Count, "gap")} between neighbouring records, in the diaries of {PlainNumber.Counted(gaps.PersonsWithGaps, "person")}; "
                + $"the longest distance is {PlainNumber.Counted(gaps.Longest, unit)}, where {PlainNumber.Count(gaps.Step)} would be no gap.";
    }

    private static string Unit(string unit) => unit == "WholeNumber" ? "step" : unit.ToLowerInvariant();

    private static string Range(Spread spread) =>
        spread.Smallest == spread.Largest
            ? PlainNumber.Count(spread.Smallest)
            : $"{PlainNumber.Count(spread.Smallest)} to {PlainNumber.Count(spread.Largest)} (median {spread.Median.ToString("0.#", System.Globalization.CultureInfo.InvariantCulture)})";

    private static void Alternatives(Letter letter, PanelProfile profile) => letter.Table(
        [
            new TableColumnPlan("alternative", IsNumber: false), new TableColumnPlan("offered"), new TableColumnPlan("chosen"), new TableColumnPlan("share of all"),
            new TableColumnPlan("where offered"), new TableColumnPlan("persons"),
        ],
        profile.Alternatives.Select(a => new[]
        {
            a.Name, PlainNumber.Count(a.Offered), PlainNumber.Count(a.Chosen), PlainNumber.Percent(a.ChosenShare),
            a.ChosenWhereOffered is { } share ? PlainNumber.Percent(share) : "never", PlainNumber.Count(a.PersonsChoosing),
        }));

    private static void LastChoice(Letter letter, PanelProfile profile, LastChoiceProfile last, ChoicePanel panel)
    {
        letter.Heading("Who ever switches");
        letter.Paragraph(
            $"{PlainNumber.Count(profile.PersonsNeverSwitching)} of {PlainNumber.Counted(profile.PersonsWithSeveralOccasions, "person")} with two or more occasions "
            + "always choose the same.");
        letter.Gap();
        if (last.RepeatedShare is not { } repeated)
        {
            letter.Paragraph($"No occasion has a previous one by the rule '{last.Rule.ToString().ToLowerInvariant()}'.");
            return;
        }

        letter.Paragraph(
            $"{PlainNumber.Counted(last.Occasions, "occasion")} have a previous one by the rule '{last.Rule.ToString().ToLowerInvariant()}'; on "
            + $"{PlainNumber.Percent(repeated)} of them the last choice is made again, and on {PlainNumber.Count(last.NotOfferedNow)} the last choice is not offered now.");
        letter.Gap();
        var names = panel.Alternatives;
        if (names.Length > WidestTransitions)
        {
            letter.Paragraph($"The table of {names.Length} x {names.Length} transitions is too wide to print; check --json FILE writes it whole.");
            return;
        }

        letter.Table(
            [new TableColumnPlan("last choice, then", IsNumber: false), .. names.Select(n => new TableColumnPlan(Shortened(n)))],
            names.Select((name, i) => (IReadOnlyList<string>)[name, .. last.Transitions[i].Select(n => PlainNumber.Count(n))]));
    }

    private static string Shortened(string name) => name.Length <= LongestHeading ? name : string.Concat(name.AsSpan(0, LongestHeading - 1), "…");
}
