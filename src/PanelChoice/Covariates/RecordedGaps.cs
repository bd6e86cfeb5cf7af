using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>
/// The caution that belongs to <c>previous = "recorded"</c> on a panel with gaps. A history rule that ignores gaps takes the last choice before
/// an absence for yesterday's: it fakes dependence over time and shrinks the habit term.
/// </summary>
internal static class RecordedGaps
{
    /// <summary>Counts the used occasions that look back across a gap, and proposes the calendar rule; null when none does.</summary>
    public static Caution? Find(
        ChoicePanel panel, OccasionHistory history, HistorySpecification specification, ImmutableArray<TermSpecification> terms, ImmutableArray<int> used)
    {
        if (specification.Previous != PreviousRule.Recorded) return null;
        var steps = terms.Select(t => TermDirection.StepsBack(t.Source)).OfType<int>().Distinct().Order().ToList();
        if (steps.Count == 0) return null;

        var measure = OccasionAxis.Usual(panel, specification.Holidays);
        var (axis, unit) = (measure.Position, measure.Step);
        var distances = new List<long>();
        var across = 0;
        var back = steps.ConvertAll(k => (Steps: k, Occasions: history.Back(k)));
        foreach (var o in used)
        {
            if (history.JustBefore(o) is var before && before >= 0) distances.Add((axis[o] - axis[before]) / unit);
            if (back.Exists(b => b.Occasions[o] is var then && then >= 0 && axis[o] - axis[then] > b.Steps * unit)) across++;
        }

        if (across == 0) return null;
        distances.Sort();
        var usual = distances[(distances.Count - 1) / 2];
        var remedy = usual > 1 || measure.Rule is not { } rule
            ? "no calendar rule fits distances as uneven as these: longest_gap leaves out what lies too far back"
            : $"previous = \"{rule.ToString().ToLowerInvariant()}\" looks at exactly that distance and leaves out what has no record there";
        return new Caution("history.gaps", string.Create(
            CultureInfo.InvariantCulture,
            $"{across} of {used.Length} used occasions look back across a gap, because previous = \"recorded\" takes the last record before an absence for the previous occasion; this fakes dependence over time and shrinks the habit term: {remedy}."));
    }
}
