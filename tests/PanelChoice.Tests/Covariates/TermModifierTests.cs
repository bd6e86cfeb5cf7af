using PanelChoice.Covariates;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Covariates;

/// <summary>Alternatives, each, base, times, transform, scale, is, levels, and the order they act in. Alternatives: bus, ferry, tram.</summary>
public class TermModifierTests
{
    private static readonly HistorySpecification NoRule = Studies.History(null);
    private static readonly HistorySpecification Step = Studies.History(PreviousRule.Step);

    private const string Ann = """
        ann 1 bus minutes=10,20,40 ticket=2 sky=wet
        ann 2 tram minutes=30,50,70 ticket=2 sky=dry
        ann 3 ferry minutes=20,20,20 ticket=2 sky=fog
        """;

    [Fact]
    public void A_plain_column_has_one_coefficient_and_is_0_where_not_offered()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", "ann 1 bus minutes=10,20,40 offered=bus,tram\nann 2 bus minutes=10,-,40 rows=bus,tram"), NoRule, Studies.Column("minutes"));
        Assert.Equal(["10 0 40", "10 0 40"], set.Shown("minutes"));
        Assert.Null(set.Covariates[0].Alternative);
        Assert.Equal([0, 1, 2], set.Covariates[0].Enters.ToArray());
        Assert.Equal(CovariateRole.Present, set.Covariates[0].Role);
    }

    [Fact]
    public void Alternatives_limit_where_a_term_enters_in_the_panels_order()
    {
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Column("minutes") with { Alternatives = ["tram", "bus"] });
        Assert.Equal([0, 2], Assert.Single(set.Covariates).Enters.ToArray());
        Assert.Equal(["10 40", "30 70", "20 20"], set.Shown("minutes"));
    }

    [Fact]
    public void Each_gives_every_alternative_but_the_base_its_own_coefficient()
    {
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Column("ticket").Each("ferry"), Studies.Column("minutes").Each(null));
        Assert.Equal(
            ["ticket [bus]", "ticket [tram]", "minutes [bus]", "minutes [ferry]", "minutes [tram]"], set.Covariates.Select(c => c.Label));
        Assert.Equal(["bus", "tram", "bus", "ferry", "tram"], set.Covariates.Select(c => c.Alternative));
        Assert.Equal([0, 0, 1, 1, 1], set.Covariates.Select(c => c.TermIndex));
        Assert.Equal(["2", "2", "2"], set.Shown("ticket [tram]"));
        Assert.Equal(["20", "50", "20"], set.Shown("minutes [ferry]"));
    }

    [Fact]
    public void Constants_are_not_stored_unless_they_are_scaled_or_multiplied()
    {
        var constant = Studies.Term("constant", new ConstantSource()).Each("bus");
        var set = Built.Set(
            Diary.Panel("bus ferry tram", Ann), NoRule,
            constant, constant with { Name = "half", Scale = 0.5 }, constant with { Name = "by ticket", Times = "ticket" });
        Assert.All(set.Covariates.Take(2), c => Assert.True(c.IsConstant && c.Values.IsEmpty));
        Assert.Equal(["0.5", "0.5", "0.5"], set.Shown("half [tram]"));
        Assert.Equal(["2", "2", "2"], set.Shown("by ticket [ferry]"));
    }

    [Fact]
    public void Fixed_and_start_values_are_handed_on()
    {
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Column("minutes") with { Fixed = -0.5, Start = -0.1 });
        Assert.Equal((-0.5, -0.1), (set.Covariates[0].Fixed, set.Covariates[0].Start));
    }

    [Fact]
    public void Transform_acts_before_lag_then_times_at_the_present_occasion_then_scale()
    {
        // Occasion 2: log of occasion 1's minutes, times occasion 2's wind (3), times the scale 10.
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus minutes=10,20,40 wind=2
                ann 2 tram minutes=30,50,70 wind=3
                """),
            Step, Studies.Column("minutes", new Lag(1)) with { Log = true, Times = "wind", Scale = 10 });
        var values = Assert.Single(set.Covariates).Values;
        Assert.Equal([30 * Math.Log(10), 30 * Math.Log(20), 30 * Math.Log(40)], values.ToArray(), (a, b) => Math.Abs(a - b) < 1e-12);
    }

    [Fact]
    public void Change_of_a_logarithm_is_the_logarithm_of_the_ratio()
    {
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), Step, Studies.Column("minutes", new Change(1)) with { Log = true });
        Assert.Equal(Math.Log(50.0 / 20), set.Covariates[0].Values[1], 1e-12);
    }

    [Fact]
    public void Is_makes_an_indicator_of_a_text_value()
    {
        var wet = Studies.Term("wet", new ColumnSource("sky", new Now(), "wet", false, null)).Each("bus");
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), NoRule, wet);
        Assert.Equal(["wet [ferry]", "wet [tram]"], set.Covariates.Select(c => c.Label));
        Assert.Equal(["1", "0", "0"], set.Shown("wet [tram]"));
    }

    [Fact]
    public void Is_can_be_lagged()
    {
        var wet = Studies.Term("wet", new ColumnSource("sky", new Lag(1), "wet", false, null)).Each("bus");
        Assert.Equal(["1", "0"], Built.Set(Diary.Panel("bus ferry tram", Ann), Step, wet).Shown("wet [tram]"));
    }

    [Fact]
    public void Levels_make_one_indicator_for_each_other_value_and_names_it()
    {
        var sky = Studies.Term("sky", new ColumnSource("sky", new Now(), null, true, "dry")).Each("bus");
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), NoRule, sky);
        Assert.Equal(["sky: fog [ferry]", "sky: fog [tram]", "sky: wet [ferry]", "sky: wet [tram]"], set.Covariates.Select(c => c.Label));
        Assert.Equal(["sky: fog", "sky: fog", "sky: wet", "sky: wet"], set.Covariates.Select(c => c.Term));
        Assert.Equal(["0", "0", "1"], set.Shown("sky: fog [ferry]"));
        Assert.Equal(["1", "0", "0"], set.Shown("sky: wet [ferry]"));
    }

    [Fact]
    public void A_level_that_the_sample_does_not_hold_gets_no_coefficient_and_is_named()
    {
        var sky = Studies.Term("sky", new ColumnSource("sky", new Now(), null, true, "dry")).Each("bus");
        var set = Built.Set(Diary.Panel("bus ferry tram", Ann), Step, sky, Studies.Term("last", new LastChoiceSource(1)));
        Assert.DoesNotContain(set.Covariates, c => c.Term == "sky: wet");
        Assert.Contains("'sky: wet'", Assert.Single(set.Cautions, c => c.Id == "term.level_absent").Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Person_mean_is_taken_over_the_sample_by_alternative_where_it_was_offered()
    {
        // A term looks back, so occasion 1 is out of the sample and of the mean. Occasion 3: ferry not offered. Occasion 5: only the bus, left out.
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus minutes=100,100,100
                ann 2 bus minutes=1,10,30
                ann 3 bus minutes=2,99,50 offered=bus,tram
                ann 4 bus minutes=3,20,70
                ann 5 bus minutes=99,99,99 offered=bus
                bob 1 tram minutes=1,1,1
                bob 2 tram minutes=7,8,9 offered=bus,tram
                """),
            Step, Studies.Term("last", new LastChoiceSource(1)), Studies.Column("minutes", new PersonMean()));
        Assert.Equal(["ann 2", "ann 3", "ann 4", "bob 2"], set.Occasions());
        Assert.Equal(["2 15 50", "2 0 50", "2 15 50", "7 0 9"], set.Shown("minutes"));
        Assert.Equal(CovariateRole.Present, set.Covariates[1].Role);
        Assert.Empty(set.Cautions);
    }

    [Fact]
    public void Person_mean_without_a_term_that_looks_back_counts_the_first_occasion_and_removes_none()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus minutes=1,10,30
                ann 2 bus minutes=3,20,50
                """),
            NoRule, Studies.Column("minutes", new PersonMean()));
        Assert.Equal(["2 15 40", "2 15 40"], set.Shown("minutes"));
    }

    [Fact]
    public void Person_mean_never_counts_the_first_occasion_once_a_term_looks_back_even_where_zero_keeps_it()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus minutes=100,100,100
                ann 2 bus minutes=1,10,30 offered=bus,tram
                ann 3 bus minutes=3,10,50 offered=bus,tram
                """),
            Step with { WithoutHistory = MissingHistory.Zero }, Studies.Term("last", new LastChoiceSource(1)), Studies.Column("minutes", new PersonMean()));
        Assert.Equal(["2 0 40", "2 0 40", "2 0 40"], set.Shown("minutes"));
        Assert.StartsWith("In 1 used occasions", Assert.Single(set.Cautions, c => c.Id == "mean.missing").Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Person_mean_of_a_logarithm_is_the_mean_of_logarithms()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", """
                ann 1 bus minutes=1,10,30
                ann 2 bus minutes=3,20,50
                """),
            NoRule, Studies.Column("minutes", new PersonMean()) with { Log = true });
        Assert.Equal(Math.Log(3) / 2, set.Covariates[0].Values[0], 1e-12);
    }
}
