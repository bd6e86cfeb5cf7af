using PanelChoice.Covariates;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Covariates;

/// <summary>Lags, leads, changes and the chosen alternative's attribute then. Alternatives: bus, ferry, tram.</summary>
public class LookingAtAttributesTests
{
    private const string First = "first recorded occasion of the person: nothing to look back to";
    private static readonly HistorySpecification Step = Studies.History(PreviousRule.Step);

    [Fact]
    public void Lag_takes_the_same_alternatives_value_then_whether_it_was_offered_then_or_not()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus delay=1,2,3 offered=bus,tram
                ann 2 ferry delay=4,5,6
                ann 3 ferry delay=7,8,9
                """),
            Step, Studies.Column("delay", new Lag(1)));
        Assert.Equal(["ann 2", "ann 3"], set.Occasions());
        Assert.Equal(["1 2 3", "4 5 6"], set.Shown("delay"));
        Assert.Equal(CovariateRole.PastConditions, set.Covariates[0].Role);
    }

    [Fact]
    public void Lag_of_what_is_not_offered_now_is_0()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus delay=1,2,3
                ann 2 bus delay=4,5,6 offered=bus,tram
                """),
            Step, Studies.Column("delay", new Lag(1)));
        Assert.Equal(["1 0 3"], set.Shown("delay"));
    }

    [Fact]
    public void An_alternative_without_a_row_then_leaves_the_occasion_without_history_and_is_named()
    {
        var panel = Diary.Panel("bus ferry tram", """
            ann 1 bus delay=1,2,3 rows=bus,tram
            ann 2 ferry delay=4,5,6
            ann 3 ferry delay=7,8,9
            """);
        var drop = Built.Set(panel, Step, Studies.Column("delay", new Lag(1)));
        Assert.Equal(["ann 3"], drop.Occasions());
        Assert.Equal([$"1 {First}", "1 no history: no delay of 'ferry' one step earlier"], drop.Reasons());

        var zero = Built.Set(panel, Step with { WithoutHistory = MissingHistory.Zero }, Studies.Column("delay", new Lag(1)));
        Assert.Equal(["0 0 0", "1 0 3", "4 5 6"], zero.Shown("delay"));
        Assert.Equal("history.zero_filled", Assert.Single(zero.Cautions).Id);
    }

    [Fact]
    public void A_missing_row_then_does_not_matter_where_the_term_does_not_apply_or_the_alternative_is_not_offered_now()
    {
        var panel = Diary.Panel("bus ferry tram", """
            ann 1 bus delay=1,2,3 rows=bus,tram
            ann 2 bus delay=4,5,6 offered=bus,tram
            """);
        Assert.Equal(["1 0 3"], Built.Set(panel, Step, Studies.Column("delay", new Lag(1))).Shown("delay"));

        var now = Diary.Panel("bus ferry tram", """
            ann 1 bus delay=1,2,3 rows=bus,tram
            ann 2 bus delay=4,5,6
            """);
        Assert.Equal(["1 3"], Built.Set(now, Step, Studies.Column("delay", new Lag(1)) with { Alternatives = ["tram", "bus"] }).Shown("delay"));
        var each = Built.Set(now, Step, Studies.Column("delay", new Lag(1)).Each("ferry"));
        Assert.Equal(["1"], each.Shown("delay [bus]"));
        Assert.Equal(["3"], each.Shown("delay [tram]"));
    }

    [Fact]
    public void An_empty_cell_then_is_no_history()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus delay=1,-,3 offered=bus,tram
                ann 2 ferry delay=4,5,6
                ann 3 ferry delay=7,8,9
                """),
            Step, Studies.Column("delay", new Lag(1)));
        Assert.Equal(["ann 3"], set.Occasions());
        Assert.Equal([$"1 {First}", "1 no history: no delay of 'ferry' one step earlier"], set.Reasons());
    }

    [Fact]
    public void Lag_2_looks_two_steps_back()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus delay=1,2,3
                ann 2 bus delay=4,5,6
                ann 3 ferry delay=7,8,9
                ann 4 ferry delay=1,1,2
                """),
            Step, Studies.Column("delay", new Lag(2)));
        Assert.Equal(["ann 3", "ann 4"], set.Occasions());
        Assert.Equal(["1 2 3", "4 5 6"], set.Shown("delay"));
    }

    [Fact]
    public void Change_is_the_present_value_minus_the_lagged_one()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus delay=1,2,3
                ann 2 bus delay=4,4,4
                ann 3 ferry delay=7,0,9
                """),
            Step, Studies.Column("delay", new Change(1)));
        Assert.Equal(["3 2 1", "3 -4 5"], set.Shown("delay"));
        Assert.Equal(CovariateRole.PastConditions, set.Covariates[0].Role);
    }

    [Fact]
    public void Lead_looks_ahead_and_no_future_is_counted_separately_from_no_history()
    {
        var panel = Diary.Panel("bus ferry tram", """
            ann 1 bus delay=1,2,3
            ann 2 bus delay=4,5,6
            ann 3 ferry delay=7,8,9
            """);
        var lead = Built.Set(panel, Step, Studies.Column("delay", new Lead(1)));
        Assert.Equal(["ann 1", "ann 2"], lead.Occasions());
        Assert.Equal(["4 5 6", "7 8 9"], lead.Shown("delay"));
        Assert.Equal(["1 no future: no record one step later"], lead.Reasons());
        Assert.Equal(CovariateRole.Present, lead.Covariates[0].Role);

        var both = Built.Set(panel, Step, Studies.Column("delay", new Lead(1)), Studies.Term("last", new LastChoiceSource(1)));
        Assert.Equal(["ann 2"], both.Occasions());
        Assert.Equal([$"1 {First}", "1 no future: no record one step later"], both.Reasons());
    }

    [Fact]
    public void A_missing_future_is_left_out_even_where_a_missing_past_counts_as_0()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus delay=1,2,3
                ann 2 bus delay=4,5,6
                ann 5 bus delay=4,5,6
                """),
            Step with { WithoutHistory = MissingHistory.Zero }, Studies.Column("delay", new Lead(1)));
        Assert.Equal(["ann 1"], set.Occasions());
    }

    [Fact]
    public void Lead_over_the_week_end_and_a_missing_row_ahead()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 2031-03-06 bus delay=1,2,3
                ann 2031-03-07 bus delay=4,5,6
                ann 2031-03-10 bus delay=7,8,9 rows=bus,tram
                ann 2031-03-11 bus delay=1,1,2
                """),
            Studies.History(PreviousRule.Workday), Studies.Column("delay", new Lead(1)));
        Assert.Equal(["ann 2031-03-06", "ann 2031-03-10"], set.Occasions());
        Assert.Equal(["4 5 6", "1 0 2"], set.Shown("delay"));
        Assert.Equal(
            ["1 no future: no record on the working day after", "1 no future: no delay of 'ferry' on the working day after"], set.Reasons());
    }

    [Fact]
    public void Chosen_then_carries_what_was_experienced_on_the_alternative_chosen_then_and_0_elsewhere()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus delay=1,2,3
                ann 2 tram delay=4,5,6
                ann 3 ferry delay=7,8,9 offered=bus,ferry
                ann 4 ferry delay=1,1,2
                """),
            Step, Studies.Column("delay", new ChosenThen(1)));
        Assert.Equal(["1 0 0", "0 0 0", "0 8 0"], set.Shown("delay"));
        Assert.Equal(CovariateRole.PastConditions, set.Covariates[0].Role);
        var two = Built.Set(set.Panel, Step, Studies.Column("delay", new ChosenThen(2)));
        Assert.Equal(["ann 3", "ann 4"], two.Occasions());
        Assert.Equal(["1 0 0", "0 0 6"], two.Shown("delay"));
    }

    [Fact]
    public void Chosen_then_needs_no_row_of_the_others()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus delay=1,2,3 rows=bus,tram
                ann 2 tram delay=4,5,6
                """),
            Step, Studies.Column("delay", new ChosenThen(1)));
        Assert.Equal(["1 0 0"], set.Shown("delay"));
    }
}
