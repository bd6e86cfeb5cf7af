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
/// <param name="Position">Position of each situation; 0 or more, rising within a person's stream.</param>
/// <param name="Stream">Only situations of one stream have a distance: the day of the week under the weekly rule, else 0.</param>
/// <param name="Streams">Number of streams.</param>
/// <param name="Unit">"recorded occasion", "step", "day", "workday" or "week".</param>
internal sealed record OccasionPositions(ImmutableArray<long> Position, ImmutableArray<int> Stream, int Streams, string Unit)
{
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
            case PreviousRule.Workday: return Calendar(panel, used, "workday", new WorkingCalendar(history.Holidays).Number);
            case PreviousRule.Week: return Weeks(panel, used);
        }

        var dates = panel.Table.OccasionKind == OccasionKind.Date;
        var calendar = new WorkingCalendar([]);
        var workdays = dates && panel.Occasion.All(calendar.IsWorkingDay);
        Func<long, long> map = workdays ? calendar.Number : o => o;
        return panel.Table.OccasionKind == OccasionKind.None || MedianDistance(panel, map) > 1
            ? Recorded(panel, used)
            : Calendar(panel, used, !dates ? "step" : workdays ? "workday" : "day", map);
    }

    private static OccasionPositions Calendar(ChoicePanel panel, ImmutableArray<int> used, string unit, Func<long, long> map)
    {
        var position = new long[used.Length];
        var first = 0L;
        for (var t = 0; t < used.Length; t++)
        {
            var at = map(panel.Occasion[used[t]]);
            if (t == 0 || panel.PersonOf[used[t]] != panel.PersonOf[used[t - 1]]) first = at;
            position[t] = at - first;
        }

        return new OccasionPositions([.. position], [.. new int[used.Length]], 1, unit);
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
