using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>
/// The caution that belongs to <c>previous = "recorded"</c> on a panel with gaps. A history rule that ignores gaps takes the last choice before
/// an absence for yesterday's: it fakes dependence over time and shrinks the habit term. Parts are first observed, which gives the unit of
/// distances, and then counted.
/// </summary>
internal sealed class RecordedGaps
{
    private readonly ImmutableArray<int> steps;
    private readonly UsualStep usual;
    private OccasionAxis? axis;
    private int across;
    private int distances;
    private int neighbours;
    private int occasions;

    /// <summary>Nothing observed yet.</summary>
    /// <param name="history">The study's rule.</param>
    /// <param name="terms">The terms that may look back.</param>
    public RecordedGaps(HistorySpecification history, ImmutableArray<TermSpecification> terms)
    {
        steps = history.Previous == PreviousRule.Recorded
            ? [.. terms.Select(t => TermDirection.StepsBack(t.Source)).OfType<int>().Distinct().Order()]
            : [];
        usual = new UsualStep(history.Holidays);
    }

    /// <summary>Learns the unit of distances from a part.</summary>
    public void Observe(ChoicePanel part)
    {
        if (!steps.IsEmpty) usual.Observe(part);
    }

    /// <summary>Counts the used occasions of a part that look back across a gap, once all parts were observed.</summary>
    public void Count(SamplePart part)
    {
        if (steps.IsEmpty) return;
        axis = usual.AxisOf(part.Panel);
        var (position, unit) = (axis.Position, axis.Step);
        var back = steps.Select(k => (Steps: k, Occasions: part.History.Back(k))).ToList();
        foreach (var o in part.Used)
        {
            if (part.History.JustBefore(o) is var before && before >= 0)
            {
                distances++;
                if ((position[o] - position[before]) / unit <= 1) neighbours++;
            }

            if (back.Exists(b => b.Occasions[o] is var then && then >= 0 && position[o] - position[then] > b.Steps * unit)) across++;
        }

        occasions += part.Used.Length;
    }

    /// <summary>The caution, which proposes the calendar rule; null when no used occasion looks back across a gap.</summary>
    public Caution? Caution()
    {
        if (across == 0) return null;
        // The lower of the two distances in the middle is above one step.
        var remedy = neighbours <= (distances - 1) / 2 || axis!.Rule is not { } rule
            ? "no calendar rule fits distances as uneven as these: longest_gap leaves out what lies too far back"
            : $"previous = \"{rule.ToString().ToLowerInvariant()}\" looks at exactly that distance and leaves out what has no record there";
        return new Caution("history.gaps", string.Create(
            CultureInfo.InvariantCulture,
            $"{across} of {occasions} used occasions look back across a gap, because previous = \"recorded\" takes the last record before an absence for the previous occasion; this fakes dependence over time and shrinks the habit term: {remedy}."));
    }
}
