using PanelChoice.Covariates;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Covariates;

/// <summary>Last choice, last nest, habit stock, past share, first choice. Alternatives: bus, ferry, tram unless said.</summary>
public class PastChoiceTests
{
    private const string First = "first recorded occasion of the person: nothing to look back to";
    private static readonly HistorySpecification NoRule = Studies.History(null);

    private const string Ann = """
        ann 1 bus
        ann 2 bus
        ann 4 tram
        ann 9 ferry
        """;

    [Fact]
    public void A_last_choice_that_is_not_offered_now_leaves_no_alternative_with_the_1()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 ferry
                ann 2 bus offered=bus,tram
                ann 3 tram
                """),
            Studies.History(PreviousRule.Step), Studies.Term("last", new LastChoiceSource(1)));
        Assert.Equal(["0 0 0", "1 0 0"], set.Shown("last"));
        Assert.Equal(CovariateRole.PastChoice, set.Covariates[0].Role);
    }

    [Fact]
    public void Last_choice_with_each_is_habit_by_mode()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", Ann), Studies.History(PreviousRule.Recorded), Studies.Term("last", new LastChoiceSource(1)).Each(null));
        Assert.Equal(["last [bus]", "last [ferry]", "last [tram]"], set.Covariates.Select(c => c.Label));
        Assert.Equal(["1", "1", "0"], set.Shown("last [bus]"));
        Assert.Equal(["0", "0", "0"], set.Shown("last [ferry]"));
        Assert.Equal(["0", "0", "1"], set.Shown("last [tram]"));
    }

    [Fact]
    public void Last_nest_is_1_for_every_alternative_whose_lowest_nest_holds_the_last_choice()
    {
        // river = { slow = { barge, ferry }, hydrofoil }; bus and tram stand alone. Order: barge bus ferry hydrofoil tram.
        var panel = Diary.Panel("barge bus ferry hydrofoil tram", """
            ann 1 ferry
            ann 2 hydrofoil
            ann 3 bus
            ann 4 tram
            """);
        var tree = SyntheticPanel.TreeOf(
            panel.Alternatives, [SyntheticPanel.Nest("river", "slow", "hydrofoil"), SyntheticPanel.Nest("slow", "barge", "ferry")]);
        var study = Studies.With(Studies.History(PreviousRule.Step), Studies.Term("nest", new LastNestSource(1)));
        var set = CovariateBuilder.Build(study, panel, tree).Value!;
        Assert.Equal(
            [
                "1 0 1 1 0", // ferry last: its nest mates, and hydrofoil, whose own nest is the river with all below it
                "0 0 0 1 0", // hydrofoil last: not in the nest of the slow boats
                "0 1 0 0 0", // bus last: an alternative in no nest is its own nest
            ],
            set.Shown("nest"));
        Assert.Equal(CovariateRole.PastChoice, set.Covariates[0].Role);
    }

    [Fact]
    public void Stock_starts_at_one_in_J_and_takes_one_step_for_each_record_whatever_the_gap()
    {
        // r = 0.6. Start 1/3 each. After bus: .2 + .4 = .6, .2, .2. After bus: .36 + .4 = .76, .12, .12. After tram: .456, .072, .072 + .4 = .472.
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Term("stock", new StockSource(0.6)));
        Assert.Equal(["ann 2", "ann 4", "ann 9"], set.Occasions());
        Assert.Equal(["0.6 0.2 0.2", "0.76 0.12 0.12", "0.456 0.072 0.472"], set.Shown("stock"));
        Assert.Equal([$"1 {First}"], set.Reasons());
        var start = Assert.Single(set.StockStarts);
        Assert.Equal("stock", start.Term);
        Assert.Equal(0.6, start.WeightAtFirst, 1e-15);
        Assert.Equal(0.36, start.WeightAtMedian, 1e-15);
        Assert.Equal(CovariateRole.PastChoice, set.Covariates[0].Role);
    }

    [Fact]
    public void Stock_with_zero_keeps_the_first_occasion_at_its_start_value()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", Ann), Studies.History(null, MissingHistory.Zero), Studies.Term("stock", new StockSource(0.6)).Each("bus"));
        Assert.Equal(4, set.Used.Length);
        Assert.Equal(["0.3333333333", "0.2", "0.12", "0.072"], set.Shown("stock [ferry]"));
        var start = Assert.Single(set.StockStarts);
        Assert.Equal(1, start.WeightAtFirst);
        Assert.Equal((0.6 + 0.36) / 2, start.WeightAtMedian, 1e-15);
        Assert.Empty(set.Cautions);
    }

    [Fact]
    public void The_start_value_weighs_what_the_largest_first_used_occasion_leaves()
    {
        // Ann's second and Bob's third record are the first used ones: weights r and r^2, of which the larger is reported.
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus
                ann 2 bus
                bob 1 bus
                bob 2 bus offered=bus
                bob 3 ferry
                """),
            NoRule, Studies.Term("stock", new StockSource(0.5)));
        Assert.Equal(["ann 2", "bob 3"], set.Occasions());
        Assert.Equal(0.5, set.StockStarts[0].WeightAtFirst);
        Assert.Equal(0.375, set.StockStarts[0].WeightAtMedian);
    }

    [Fact]
    public void Past_share_is_the_share_of_earlier_records_on_which_the_alternative_was_chosen()
    {
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Term("share", new PastShareSource()));
        Assert.Equal(["1 0 0", "1 0 0", "0.6666666667 0 0.3333333333"], set.Shown("share"));
        Assert.Equal([$"1 {First}"], set.Reasons());
        Assert.Equal(CovariateRole.TasteProxy, set.Covariates[0].Role);
    }

    [Fact]
    public void First_choice_has_no_history_at_the_first_occasion_where_it_would_be_the_answer()
    {
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Term("first", new FirstChoiceSource()));
        Assert.Equal(["ann 2", "ann 4", "ann 9"], set.Occasions());
        Assert.Equal(["1 0 0", "1 0 0", "1 0 0"], set.Shown("first"));
        Assert.Equal(CovariateRole.TasteProxy, set.Covariates[0].Role);
    }

    [Fact]
    public void First_choice_comes_from_the_recorded_panel_even_when_that_occasion_offered_nothing_else()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 tram offered=tram
                ann 2 bus
                """),
            NoRule, Studies.Term("first", new FirstChoiceSource()));
        Assert.Equal(["0 0 1"], set.Shown("first"));
    }
}
