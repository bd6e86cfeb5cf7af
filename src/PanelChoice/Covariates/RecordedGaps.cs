using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Data;
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

        var (axis, unit, proposal) = Calendar(panel, specification);
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
        var remedy = usual > 1 || proposal is null
            ? "no calendar rule fits distances as uneven as these: longest_gap leaves out what lies too far back"
            : $"previous = \"{proposal}\" looks at exactly that distance and leaves out what has no record there";
        return new Caution("history.gaps", string.Create(
            CultureInfo.InvariantCulture,
            $"{across} of {used.Length} used occasions look back across a gap, because previous = \"recorded\" takes the last record before an absence for the previous occasion; this fakes dependence over time and shrinks the habit term: {remedy}."));
    }

    /// <summary>The axis on which neighbouring occasions differ by one unit, and the rule that measures in it.</summary>
    private static (long[] Axis, long Unit, string? Proposal) Calendar(ChoicePanel panel, HistorySpecification specification)
    {
        var axis = panel.Occasion.ToArray();
        var common = 0L;
        for (var o = 1; o < axis.Length; o++)
            if (panel.PersonOf[o] == panel.PersonOf[o - 1]) common = CommonDivisor(axis[o] - axis[o - 1], common);
        if (common == 0) return (axis, 1, null);
        if (panel.Table.OccasionKind != OccasionKind.Date) return (axis, common, common == 1 ? "step" : null);
        if (common % 7 == 0) return (axis, common, common == 7 ? "week" : null);

        var calendar = new WorkingCalendar(specification.Holidays);
        if (!axis.All(calendar.IsWorkingDay)) return (axis, 1, "day");
        for (var o = 0; o < axis.Length; o++) axis[o] = calendar.Number(axis[o]);
        return (axis, 1, "workday");
    }

    private static long CommonDivisor(long a, long b) => b == 0 ? a : CommonDivisor(b, a % b);
}
