using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// Where each situation stands on its person's time line, in whole steps. The unit follows the study's rule for looking back when that is a
/// calendar rule; otherwise whole numbers are steps and dates are workdays (when no date is a Saturday or Sunday) or days. Where the typical
/// distance is above one such unit the recorded order counts instead: decays by the calendar would then see no neighbours at all.
/// </summary>
/// <param name="Position">Position of each situation; 0 is the person's first recorded occasion (week: the first week of any date).</param>
/// <param name="Stream">Only situations of one stream have a distance: the day of the week under the weekly rule, else 0.</param>
/// <param name="Streams">Number of streams.</param>
/// <param name="Unit">"recorded occasion", "step", "day", "workday" or "week".</param>
internal sealed record OccasionPositions(ImmutableArray<long> Position, ImmutableArray<int> Stream, int Streams, string Unit)
{
    private const int WorkdaysInWeek = 5;
    private const int DaysInWeek = 7;

    /// <summary>Positions of the used occasions of a panel.</summary>
    /// <param name="history">The study's rule for looking back.</param>
    /// <param name="panel">The recorded panel.</param>
    /// <param name="used">Occasions of the estimation sample.</param>
    public static OccasionPositions Of(HistorySpecification history, ChoicePanel panel, ImmutableArray<int> used)
    {
        ArgumentNullException.ThrowIfNull(history);
        ArgumentNullException.ThrowIfNull(panel);
        switch (history.Previous)
        {
            case PreviousRule.Step: return Calendar(panel, used, "step", o => o);
            case PreviousRule.Day: return Calendar(panel, used, "day", o => o);
            case PreviousRule.Workday: return Calendar(panel, used, "workday", Workdays(history.Holidays));
            case PreviousRule.Week: return Weeks(panel, used);
        }

        var dates = panel.Table.OccasionKind == OccasionKind.Date;
        var workdays = dates && panel.Occasion.All(o => o % DaysInWeek < WorkdaysInWeek);
        Func<long, long> map = workdays ? Workdays([]) : o => o;
        return panel.Table.OccasionKind == OccasionKind.None || MedianDistance(panel, map) > 1
            ? Recorded(panel, used)
            : Calendar(panel, used, !dates ? "step" : workdays ? "workday" : "day", map);
    }

    /// <summary>Number of workdays before a day number (day 0, 1 January of year 1, was a Monday), holidays taken out.</summary>
    internal static Func<long, long> Workdays(ImmutableArray<DateOnly> holidays)
    {
        var off = holidays.IsDefault
            ? []
            : holidays.Select(d => (long)d.DayNumber).Where(d => d % DaysInWeek < WorkdaysInWeek).Distinct().Order().ToArray();
        return day =>
        {
            var found = Array.BinarySearch(off, day);
            return (day / DaysInWeek * WorkdaysInWeek) + Math.Min(day % DaysInWeek, WorkdaysInWeek) - (found < 0 ? ~found : found);
        };
    }

    private static OccasionPositions Calendar(ChoicePanel panel, ImmutableArray<int> used, string unit, Func<long, long> map)
    {
        var position = used.Select(o => map(panel.Occasion[o]) - map(panel.Occasion[panel.PersonStart[panel.PersonOf[o]]])).ToImmutableArray();
        // Two occasions less than a step apart have no distance on this calendar; then only the order is left.
        for (var t = 1; t < used.Length; t++)
            if (panel.PersonOf[used[t]] == panel.PersonOf[used[t - 1]] && position[t] <= position[t - 1]) return Recorded(panel, used);
        return new OccasionPositions(position, [.. new int[used.Length]], 1, unit);
    }

    private static OccasionPositions Weeks(ChoicePanel panel, ImmutableArray<int> used) => new(
        [.. used.Select(o => panel.Occasion[o] / DaysInWeek)], [.. used.Select(o => (int)(panel.Occasion[o] % DaysInWeek))], DaysInWeek, "week");

    private static OccasionPositions Recorded(ChoicePanel panel, ImmutableArray<int> used) => new(
        [.. used.Select(o => (long)(o - panel.PersonStart[panel.PersonOf[o]]))], [.. new int[used.Length]], 1, "recorded occasion");

    private static double MedianDistance(ChoicePanel panel, Func<long, long> map)
    {
        var distances = new List<long>();
        for (var o = 1; o < panel.Occasions; o++)
            if (panel.PersonOf[o] == panel.PersonOf[o - 1]) distances.Add(map(panel.Occasion[o]) - map(panel.Occasion[o - 1]));
        if (distances.Count == 0) return 0;
        distances.Sort();
        return (distances[(distances.Count - 1) / 2] + distances[distances.Count / 2]) / 2.0;
    }
}
