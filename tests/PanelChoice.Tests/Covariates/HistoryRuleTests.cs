using PanelChoice.Panels;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Covariates;

/// <summary>Which earlier occasion is the previous one, on panels small enough to follow with a pencil. Alternatives: bus, ferry, tram.</summary>
public class HistoryRuleTests
{
    private const string First = "first recorded occasion of the person: nothing to look back to";
    private static readonly TermSpecification Last = Studies.Term("last", new LastChoiceSource(1));

    [Fact]
    public void Recorded_takes_the_previous_record_whatever_the_gap_and_never_another_persons()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus
                ann 2 ferry
                ann 9 tram
                bob 3 tram
                bob 4 bus
                """),
            Studies.History(PreviousRule.Recorded), Last);
        Assert.Equal(["ann 2", "ann 9", "bob 4"], set.Occasions());
        Assert.Equal(["1 0 0", "0 1 0", "0 0 1"], set.Shown("last"));
        Assert.Equal([$"2 {First}"], set.Reasons());
    }

    [Fact]
    public void Lines_in_any_order_give_the_same_history()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                bob 4 bus
                ann 9 tram
                bob 3 tram
                ann 1 bus
                ann 2 ferry
                """),
            Studies.History(PreviousRule.Recorded), Last);
        Assert.Equal(["ann 2", "ann 9", "bob 4"], set.Occasions());
        Assert.Equal(["1 0 0", "0 1 0", "0 0 1"], set.Shown("last"));
    }

    [Fact]
    public void Recorded_with_k_2_takes_the_second_record_back()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus
                ann 2 ferry
                ann 9 tram
                ann 10 tram
                """),
            Studies.History(PreviousRule.Recorded), Studies.Term("last", new LastChoiceSource(2)));
        Assert.Equal(["ann 9", "ann 10"], set.Occasions());
        Assert.Equal(["1 0 0", "0 1 0"], set.Shown("last"));
        Assert.Equal([$"1 {First}", "1 no history: fewer than 2 recorded occasions before it"], set.Reasons());
    }

    [Fact]
    public void Longest_gap_is_measured_to_the_kth_previous_record()
    {
        var panel = Diary.Panel("bus ferry tram", """
            ann 1 bus
            ann 2 ferry
            ann 5 tram
            ann 6 bus
            ann 10 bus
            """);
        var one = Built.Set(panel, Studies.History(PreviousRule.Recorded, longestGap: 3), Last);
        Assert.Equal(["ann 2", "ann 5", "ann 6"], one.Occasions());
        Assert.Equal([$"1 {First}", "1 no history: the previous recorded occasion lies more than 3 units of occasion back"], one.Reasons());
        var two = Built.Set(panel, Studies.History(PreviousRule.Recorded, longestGap: 4), Studies.Term("last", new LastChoiceSource(2)));
        Assert.Equal(["ann 5", "ann 6"], two.Occasions());
        Assert.Equal(["1 0 0", "0 1 0"], two.Shown("last"));
        Assert.Equal([$"1 {First}", "2 no history: no 2 recorded occasions before it within 4 units of occasion"], two.Reasons());
    }

    [Fact]
    public void Longest_gap_counts_days_for_dates()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2031-03-31 bus
                ann 2031-04-02 ferry
                ann 2031-04-05 ferry
                """),
            Studies.History(PreviousRule.Recorded, longestGap: 2), Last);
        Assert.Equal(["ann 2031-04-02"], set.Occasions());
        Assert.Equal([$"1 {First}", "1 no history: the previous recorded occasion lies more than 2 days back"], set.Reasons());
    }

    [Fact]
    public void Step_looks_at_exactly_the_number_before()
    {
        var panel = Diary.Panel("bus ferry tram", """
            ann -1 bus
            ann 0 ferry
            ann 2 tram
            ann 3 bus
            """);
        var set = Built.Set(panel, Studies.History(PreviousRule.Step), Last);
        Assert.Equal(["ann 0", "ann 3"], set.Occasions());
        Assert.Equal(["1 0 0", "0 0 1"], set.Shown("last"));
        Assert.Equal([$"1 {First}", "1 no history: no record one step earlier"], set.Reasons());
        var three = Built.Set(panel, Studies.History(PreviousRule.Step), Studies.Term("last", new LastChoiceSource(3)));
        Assert.Equal(["ann 2", "ann 3"], three.Occasions());
        Assert.Equal(["1 0 0", "0 1 0"], three.Shown("last"));
        Assert.Equal([$"1 {First}", "1 no history: no record 3 steps earlier"], three.Reasons());
    }

    [Fact]
    public void Day_looks_at_the_calendar_day_before_across_a_leap_day()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2027-02-28 bus
                ann 2027-03-01 ferry
                ann 2028-02-28 bus
                ann 2028-02-29 ferry
                ann 2028-03-01 tram
                bob 2028-02-28 bus
                bob 2028-03-01 tram
                """),
            Studies.History(PreviousRule.Day), Last);
        Assert.Equal(["ann 2027-03-01", "ann 2028-02-29", "ann 2028-03-01"], set.Occasions());
        Assert.Equal(["1 0 0", "1 0 0", "0 1 0"], set.Shown("last"));
        Assert.Equal([$"2 {First}", "2 no history: no record on the day before"], set.Reasons());
    }

    [Fact]
    public void Day_does_not_join_Friday_to_Monday()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2031-03-06 bus
                ann 2031-03-07 bus
                ann 2031-03-10 ferry
                """),
            Studies.History(PreviousRule.Day), Last);
        Assert.Equal(["ann 2031-03-07"], set.Occasions());
    }

    [Fact]
    public void Workday_joins_Friday_to_Monday_and_skips_nothing_else()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2031-03-06 bus
                ann 2031-03-07 tram
                ann 2031-03-10 ferry
                ann 2031-03-12 ferry
                """),
            Studies.History(PreviousRule.Workday), Last);
        Assert.Equal(["ann 2031-03-07", "ann 2031-03-10"], set.Occasions());
        Assert.Equal(["1 0 0", "0 0 1"], set.Shown("last"));
        Assert.Equal([$"1 {First}", "1 no history: no record on the working day before"], set.Reasons());
    }

    [Fact]
    public void Workday_counts_k_working_days_back_over_week_ends_and_holidays()
    {
        // 2031-04-14 and -15 are a Monday and a Tuesday off; Saturday the 12th is named too, which must not count twice.
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2031-04-10 bus
                ann 2031-04-11 tram
                ann 2031-04-16 ferry
                ann 2031-04-17 bus
                """),
            Studies.History(PreviousRule.Workday, holidays: ["2031-04-15", "2031-04-14", "2031-04-12"]),
            Last, Studies.Term("before last", new LastChoiceSource(2)));
        Assert.Equal(["ann 2031-04-16", "ann 2031-04-17"], set.Occasions());
        Assert.Equal(["0 0 1", "0 1 0"], set.Shown("last"));
        Assert.Equal(["1 0 0", "0 0 1"], set.Shown("before last"));
        Assert.Equal([$"1 {First}", "1 no history: no record 2 working days before"], set.Reasons());
    }

    [Fact]
    public void Workday_crosses_a_leap_day()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2028-02-28 bus
                ann 2028-02-29 ferry
                ann 2028-03-01 tram
                """),
            Studies.History(PreviousRule.Workday), Last);
        Assert.Equal(["1 0 0", "0 1 0"], set.Shown("last"));
    }

    [Fact]
    public void Under_workday_a_week_end_or_holiday_record_is_left_out_for_its_own_reason_and_is_nobodys_history()
    {
        // Saturday 8 March, Monday 10 March (holiday), Tuesday 11 March: the previous working day of Tuesday is Friday the 7th.
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2031-03-07 bus
                ann 2031-03-08 ferry
                ann 2031-03-10 ferry
                ann 2031-03-11 tram
                bob 2031-03-08 ferry
                bob 2031-03-11 bus
                bob 2031-03-12 tram
                """),
            Studies.History(PreviousRule.Workday, holidays: "2031-03-10"),
            Last, Studies.Term("first", new FirstChoiceSource()), Studies.Term("share", new PastShareSource()), Studies.Term("stock", new StockSource(0.5)));
        Assert.Equal(["ann 2031-03-11", "bob 2031-03-12"], set.Occasions());
        Assert.Equal(["1 0 0", "1 0 0"], set.Shown("last"));
        Assert.Equal(["1 0 0", "1 0 0"], set.Shown("first"));
        Assert.Equal(["1 0 0", "1 0 0"], set.Shown("share"));
        Assert.Equal(["0.6666666667 0.1666666667 0.1666666667", "0.6666666667 0.1666666667 0.1666666667"], set.Shown("stock"));
        Assert.Equal(["3 dated on a week-end or holiday, which the workday rule does not know", $"2 {First}"], set.Reasons());
    }

    [Fact]
    public void Week_looks_exactly_seven_days_back()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2031-03-03 bus
                ann 2031-03-05 tram
                ann 2031-03-10 ferry
                ann 2031-03-17 tram
                """),
            Studies.History(PreviousRule.Week), Last);
        Assert.Equal(["ann 2031-03-10", "ann 2031-03-17"], set.Occasions());
        Assert.Equal(["1 0 0", "0 1 0"], set.Shown("last"));
        var two = Built.Set(set.Panel, Studies.History(PreviousRule.Week), Studies.Term("last", new LastChoiceSource(2)));
        Assert.Equal(["ann 2031-03-17"], two.Occasions());
        Assert.Equal(["1 0 0"], two.Shown("last"));
    }

    [Fact]
    public void An_occasion_that_is_left_out_is_still_the_previous_occasion_of_the_next_one()
    {
        // On day 2 only the ferry ran: nothing to choose, but the ferry is what Ann took last when day 3 comes.
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus
                ann 2 ferry offered=ferry
                ann 3 tram
                """),
            Studies.History(PreviousRule.Step), Last);
        Assert.Equal(["ann 3"], set.Occasions());
        Assert.Equal(["0 1 0"], set.Shown("last"));
        Assert.Equal(["1 only one alternative offered", $"1 {First}"], set.Reasons());
    }

    [Fact]
    public void Every_occasion_is_used_or_has_exactly_one_reason()
    {
        // Ann's first occasion is both a single-alternative one and a first one: it is counted once, as what it is without any term.
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus offered=bus
                ann 2 ferry
                bob 1 ferry
                bob 3 ferry
                """),
            Studies.History(PreviousRule.Step), Last);
        Assert.Equal(["ann 2"], set.Occasions());
        Assert.Equal(["1 only one alternative offered", $"1 {First}", "1 no history: no record one step earlier"], set.Reasons());
    }

    [Fact]
    public void Without_a_term_that_looks_back_nothing_is_left_out_for_history()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus minutes=5,6,7
                ann 7 ferry minutes=7,6,8
                """),
            Studies.History(null), Studies.Column("minutes"));
        Assert.Equal(["ann 1", "ann 7"], set.Occasions());
        Assert.Empty(set.LeftOut);
        Assert.Empty(set.Cautions);
    }

    [Fact]
    public void Zero_keeps_the_occasion_and_sets_only_the_covariate_that_lacks_its_history()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus delay=1,2,3
                ann 2 ferry delay=4,5,6
                ann 4 ferry delay=7,8,9
                """),
            Studies.History(PreviousRule.Step, MissingHistory.Zero),
            Last, Studies.Column("delay"), Studies.Column("delay", new Lag(1)) with { Name = "delay then" }, Studies.Term("first", new FirstChoiceSource()));
        Assert.Equal(["ann 1", "ann 2", "ann 4"], set.Occasions());
        Assert.Equal(["0 0 0", "1 0 0", "0 0 0"], set.Shown("last"));
        Assert.Equal(["1 2 3", "4 5 6", "7 8 9"], set.Shown("delay"));
        Assert.Equal(["0 0 0", "1 2 3", "0 0 0"], set.Shown("delay then"));
        Assert.Equal(["0 0 0", "1 0 0", "1 0 0"], set.Shown("first"));
        Assert.Empty(set.LeftOut);
        var caution = Assert.Single(set.Cautions);
        Assert.Equal("history.zero_filled", caution.Id);
        Assert.StartsWith("In 2 used occasions 'delay then' has no history and counts as 0", caution.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Recorded_over_gaps_is_cautioned_with_their_number_and_the_rule_that_fits()
    {
        var workdays = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2031-03-06 bus
                ann 2031-03-07 tram
                ann 2031-03-10 ferry
                ann 2031-03-12 ferry
                bob 2031-03-06 bus
                bob 2031-03-10 bus
                """),
            Studies.History(PreviousRule.Recorded), Last);
        var caution = Assert.Single(workdays.Cautions);
        Assert.Equal("history.gaps", caution.Id);
        Assert.StartsWith("2 of 4 used occasions look back across a gap", caution.Sentence, StringComparison.Ordinal);
        Assert.Contains("previous = \"workday\"", caution.Sentence, StringComparison.Ordinal);

        var steps = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus
                ann 2 tram
                ann 3 tram
                ann 5 ferry
                """),
            Studies.History(PreviousRule.Recorded), Last, Studies.Term("before", new LastChoiceSource(2)));
        // Day 3 looks back to 2 and 1; day 5 looks back to 3 (a gap of 2 for one step) and to 2 (3 for two steps).
        Assert.StartsWith("1 of 2 used occasions", Assert.Single(steps.Cautions).Sentence, StringComparison.Ordinal);
        Assert.Contains("previous = \"step\"", steps.Cautions[0].Sentence, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("ann 2031-03-03 bus\nann 2031-03-10 tram\nann 2031-03-17 bus\nann 2031-03-31 bus", "\"week\"")]
    [InlineData("ann 2031-03-03 bus\nann 2031-03-04 tram\nann 2031-03-05 bus\nann 2031-03-08 bus", "\"day\"")]
    [InlineData("ann 2031-03-03 bus\nann 2031-03-14 tram\nann 2031-04-25 bus", "longest_gap")]
    [InlineData("ann 10 bus\nann 20 tram\nann 30 bus\nann 50 bus", "longest_gap")]
    public void The_caution_proposes_what_fits_the_dates(string lines, string proposal)
    {
        var set = Built.Set(Diary.Panel("bus ferry tram", lines), Studies.History(PreviousRule.Recorded), Last);
        Assert.Contains(proposal, Assert.Single(set.Cautions).Sentence, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("ann 2031-03-06 bus\nann 2031-03-07 tram\nann 2031-03-10 bus")]
    [InlineData("ann 1970 bus\nann 1972 tram\nann 1974 bus")]
    public void Recorded_without_gaps_is_not_cautioned(string lines) =>
        Assert.Empty(Built.Set(Diary.Panel("bus ferry tram", lines), Studies.History(PreviousRule.Recorded), Last).Cautions);

    [Fact]
    public void Working_days_are_numbered_in_a_row()
    {
        var calendar = new WorkingCalendar([DateOnly.Parse("2031-04-14", System.Globalization.CultureInfo.InvariantCulture)]);
        long? before = null;
        for (var day = Diary.Day("2031-03-28"); day <= Diary.Day("2031-05-02"); day++)
        {
            var date = DateOnly.FromDayNumber((int)day);
            var isWorking = date.DayOfWeek is not (DayOfWeek.Saturday or DayOfWeek.Sunday) && date != new DateOnly(2031, 4, 14);
            Assert.Equal(isWorking, calendar.IsWorkingDay(day));
            if (!isWorking) continue;
            if (before is { } b) Assert.Equal(b + 1, calendar.Number(day));
            before = calendar.Number(day);
        }
    }
}
