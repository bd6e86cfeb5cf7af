using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// Where each situation stands on its person's time line, in whole steps. The unit follows the study's rule for looking back when that is a
/// calendar rule; otherwise whole numbers are steps and dates are workdays (when no date is a Saturday or Sunday) or days. Where the typical
/// distance is above one such unit the recorded order counts instead: decays by the calendar would then see no neighbours at all. Positions are worked out
/// where they are asked for.
/// </summary>
internal sealed class OccasionPositions
{
    private const int DaysInWeek = 7;

    private readonly Func<int, long> place;
    private readonly Func<int, int> stream;

    /// <summary>Positions that are given.</summary>
    /// <param name="position">Position of each situation; 0 or more, rising within a person's stream.</param>
    /// <param name="stream">Stream of each situation.</param>
    /// <param name="streams">Number of streams.</param>
    /// <param name="unit">Their unit.</param>
    public OccasionPositions(ImmutableArray<long> position, ImmutableArray<int> stream, int streams, string unit)
        : this(unit, streams, t => position[t], t => stream[t])
    {
    }

    private OccasionPositions(string unit, int streams, Func<int, long> place, Func<int, int> stream)
    {
        Unit = unit;
        Streams = streams;
        this.place = place;
        this.stream = stream;
    }

    /// <summary>"recorded occasion", "step", "day", "workday" or "week".</summary>
    public string Unit { get; }

    /// <summary>Number of streams.</summary>
    public int Streams { get; }

    /// <summary>Positions of the situations of a sample.</summary>
    /// <param name="history">The study's rule for looking back.</param>
    /// <param name="sample">The sample.</param>
    public static OccasionPositions Of(HistorySpecification history, EstimationSample sample)
    {
        ArgumentNullException.ThrowIfNull(history);
        ArgumentNullException.ThrowIfNull(sample);
        var times = sample.Times;
        switch (history.Previous)
        {
            case PreviousRule.Step: return Calendar("step", t => times.Occasion[t]);
            case PreviousRule.Day: return Calendar("day", t => times.Occasion[t]);
            case PreviousRule.Workday: return Workdays(new WorkingCalendar(history.Holidays));
            case PreviousRule.Week:
                return new OccasionPositions("week", DaysInWeek, t => times.Occasion[t] / DaysInWeek, t => (int)(times.Occasion[t] % DaysInWeek));
        }

        if (sample.OccasionKind == OccasionKind.None || times.AreMostlyApart) return new OccasionPositions("recorded occasion", 1, t => times.Record[t], _ => 0);
        return times.AreWorkdays ? Workdays(new WorkingCalendar([])) : Calendar(sample.OccasionKind == OccasionKind.Date ? "day" : "step", t => times.Occasion[t]);

        OccasionPositions Workdays(WorkingCalendar calendar) => Calendar("workday", t => calendar.Number(times.Occasion[t]));
    }

    /// <summary>Where a situation stands, in steps from the person's first situation or from a common beginning; never below 0.</summary>
    /// <param name="situation">The situation.</param>
    /// <param name="first">The person's first situation.</param>
    public long Position(int situation, int first) => Unit is "week" or "recorded occasion" ? place(situation) : place(situation) - place(first);

    /// <summary>Only situations of one stream have a distance: the day of the week under the weekly rule, else 0.</summary>
    public int Stream(int situation) => stream(situation);

    private static OccasionPositions Calendar(string unit, Func<int, long> place) => new(unit, 1, place, _ => 0);
}
