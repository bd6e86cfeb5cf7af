using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>The likely cause of dependence, with what must be said beside it.</summary>
/// <param name="Cause">The cause; "unclear" where the static fit could not be made or does not tell.</param>
/// <param name="LastPrediction">z of the last occasion's prediction in the static fit; null when it has no variance or there is no fit.</param>
/// <param name="Notes">Sentences.</param>
internal sealed record CauseFinding(DependenceCause Cause, double? LastPrediction, ImmutableArray<string> Notes)
{
    /// <summary>Fits the static model, scores it and applies the rule.</summary>
    /// <param name="study">The study.</param>
    /// <param name="sample">Sample of the user's model.</param>
    /// <param name="design">Makes the design of the static model.</param>
    /// <param name="form">Form of the user's model.</param>
    /// <param name="positions">Where the situations stand in time.</param>
    /// <param name="dates">Dates, when the calendar is shared.</param>
    /// <param name="commonDays">Whether common days were found: then residuals are taken as deviations from their date's mean first,
    /// because lasting shocks to everybody look like dependence of each person on the own past.</param>
    /// <param name="work">Threads, progress, cancellation.</param>
    public static CauseFinding Of(
        StudySpecification study, EstimationSample sample, Func<StaticDesign?> design, NestedLogitForm form, OccasionPositions positions, CompactNumbers? dates,
        bool commonDays, WorkContext work)
    {
        var notes = new List<string>();
        CauseFinding Unclear(string why)
        {
            notes.Add($"The cause cannot be told: {why}.");
            return new CauseFinding(DependenceCause.Unclear, null, [.. notes]);
        }

        var fit = StaticFit.Of(study, sample, design(), form, work);
        if (fit.Model is not { } still) return Unclear(fit.Reason!);
        var battery = ScoreBattery.Compute(
            still.Design, still.Form, still.Parameters, positions, CauseEvidence.LargestLag, commonDays ? dates : null, commonDays, work.Threads);
        if (battery is null) return Unclear("the information of the model without past choices is singular");
        if (DecayGridDetector.Of(battery, study.Diagnostics.Draws, study.Diagnostics.Seed) is not { } detector)
            return Unclear("the residuals of the model without past choices leave nothing to compare");

        notes.Add("The cause is judged on a second fit to the same occasions, without past choices"
            + (fit.Means.IsEmpty ? " (and without person means: none could be added)." : $" and with {string.Join(", ", fit.Means)}."));
        if (!fit.LeftOut.IsEmpty) notes.Add($"Left out of that fit as collinear or not estimable: {string.Join(", ", fit.LeftOut)}.");
        if (commonDays) notes.Add("Because people are moved by the same days, the cause is judged on residuals taken as deviations from each date's mean.");
        var judgement = CauseRule.Judge(CauseEvidence.Of(battery, detector.PValue), study.Diagnostics.Level);
        if (detector.PValue > study.Diagnostics.Level)
            notes.Add("In that fit the detector itself stays quiet, so the cause cannot be told.");
        return new CauseFinding(
            judgement.Cause, battery.LastPrediction.IsDefined ? battery.LastPrediction.Z : null, [.. notes]);
    }
}
