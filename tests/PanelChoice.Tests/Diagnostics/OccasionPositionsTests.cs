using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Diagnostics;
using PanelChoice.Panels;
using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Diagnostics;

public class OccasionPositionsTests
{
    private static readonly DateOnly Monday = new(2031, 3, 3);

    [Fact]
    public void A_stated_step_rule_counts_whole_numbers_even_with_wide_gaps()
    {
        var p = Of(PreviousRule.Step, OccasionKind.WholeNumber, [3, 13, 14, 40]);
        Assert.Equal("step", p.Unit);
        Assert.Equal([0, 10, 11, 37], p.Position.ToArray());
    }

    [Fact]
    public void Friday_is_one_workday_before_Monday()
    {
        var p = Of(PreviousRule.Workday, OccasionKind.Date, Days(3, 4, 7, 8, 14));
        Assert.Equal("workday", p.Unit);
        Assert.Equal([0, 1, 2, 3, 7], p.Position.ToArray());
    }

    [Fact]
    public void A_listed_holiday_is_no_workday()
    {
        var p = Of(PreviousRule.Workday, OccasionKind.Date, Days(0, 2, 4), holidays: [Monday.AddDays(1)]);
        Assert.Equal([0, 1, 3], p.Position.ToArray());
    }

    [Fact]
    public void Dates_without_a_week_end_among_them_count_as_workdays_and_with_one_as_days()
    {
        var workdays = Of(null, OccasionKind.Date, Days(3, 4, 7, 8));
        Assert.Equal("workday", workdays.Unit);
        Assert.Equal([0, 1, 2, 3], workdays.Position.ToArray());

        var days = Of(null, OccasionKind.Date, Days(3, 4, 5, 6, 7));
        Assert.Equal("day", days.Unit);
        Assert.Equal([0, 1, 2, 3, 4], days.Position.ToArray());
    }

    [Fact]
    public void A_stated_day_rule_counts_days_across_week_ends()
    {
        var p = Of(PreviousRule.Day, OccasionKind.Date, Days(3, 4, 7, 8));
        Assert.Equal("day", p.Unit);
        Assert.Equal([0, 1, 4, 5], p.Position.ToArray());
    }

    [Fact]
    public void Where_the_typical_distance_is_above_one_unit_the_recorded_order_counts_but_only_without_a_calendar_rule()
    {
        var p = Of(PreviousRule.Recorded, OccasionKind.WholeNumber, [1, 5, 9, 10, 20]);
        Assert.Equal("recorded occasion", p.Unit);
        Assert.Equal([0, 1, 2, 3, 4], p.Position.ToArray());
        Assert.Equal("step", Of(PreviousRule.Recorded, OccasionKind.WholeNumber, [1, 2, 3, 9]).Unit);
    }

    [Fact]
    public void The_recorded_order_counts_occasions_that_are_not_in_the_sample()
    {
        var p = Of(PreviousRule.Recorded, OccasionKind.WholeNumber, [1, 5, 9, 13], used: [1, 3]);
        Assert.Equal([1, 3], p.Position.ToArray());
    }

    [Fact]
    public void Under_the_weekly_rule_each_weekday_has_its_own_time_line()
    {
        var p = Of(PreviousRule.Week, OccasionKind.Date, Days(0, 2, 7, 9, 21));
        Assert.Equal("week", p.Unit);
        Assert.Equal(7, p.Streams);
        Assert.Equal([0, 2, 0, 2, 0], p.Stream.ToArray());
        Assert.Equal([0L, 0, 1, 1, 3], p.Position.Select(x => x - p.Position[0]));
    }

    [Fact]
    public void Positions_start_anew_with_each_person()
    {
        var panel = Panel(OccasionKind.WholeNumber, [4, 5, 6, 1, 2], [0, 3, 5]);
        var p = Of(new HistorySpecification(PreviousRule.Step, [], null, MissingHistory.Drop), panel, [1, 2, 3, 4]);
        Assert.Equal([0L, 1, 0, 1], [p.Position(0, 0), p.Position(1, 0), p.Position(2, 2), p.Position(3, 2)]);
    }

    private static long[] Days(params int[] after) => [.. after.Select(d => (long)Monday.AddDays(d).DayNumber)];

    private static Line Of(
        PreviousRule? rule, OccasionKind kind, long[] occasions, ImmutableArray<DateOnly>? holidays = null, int[]? used = null)
    {
        var panel = Panel(kind, occasions, [0, occasions.Length]);
        ImmutableArray<int> sample = [.. used ?? [.. Enumerable.Range(0, occasions.Length)]];
        var p = Of(new HistorySpecification(rule, holidays ?? [], null, MissingHistory.Drop), panel, sample);
        var situations = Enumerable.Range(0, sample.Length);
        return new Line(p.Unit, p.Streams, [.. situations.Select(t => p.Position(t, 0))], [.. situations.Select(p.Stream)]);
    }

    private static OccasionPositions Of(HistorySpecification history, ChoicePanel panel, ImmutableArray<int> used) => OccasionPositions.Of(
        history, new EstimationSample("made", "", 0, 0, 0, panel.Table.OccasionKind, false, 0, 0, [], [], [], [], []) { Times = SituationTimes.Of(panel, used) });

    private static ChoicePanel Panel(OccasionKind kind, long[] occasions, int[] personStart)
    {
        var none = new CodedColumn([], []);
        var table = new ChoiceTable(
            "made", "", [], none, kind, [], none, [], [], [], ImmutableDictionary<string, ImmutableArray<double>>.Empty,
            ImmutableDictionary<string, CodedColumn>.Empty);
        var persons = personStart.Length - 1;
        ImmutableArray<string> ids = [.. Enumerable.Range(0, persons).Select(p => $"p{p}")];
        return new ChoicePanel(
            table, ids, ["A", "B"], [.. personStart],
            [.. Enumerable.Range(0, occasions.Length).Select(o => Array.FindLastIndex(personStart, s => s <= o))],
            [.. occasions], [], [], [], [.. Enumerable.Repeat(1.0, persons)], "person", ids, [.. Enumerable.Range(0, persons)]);
    }

    private sealed record Line(string Unit, int Streams, ImmutableArray<long> Position, ImmutableArray<int> Stream);
}
