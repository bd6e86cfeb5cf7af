using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Covariates;

/// <summary>What is wrong between the terms and the data is a list of problems, with the place and the remedy.</summary>
public class TermProblemTests
{
    private static readonly HistorySpecification NoRule = Studies.History(null);

    private const string Ann = """
        ann 1 bus minutes=10,0,40 ticket=2 sky=wet
        ann 2 tram minutes=30,50,-7 ticket=2 sky=dry
        """;

    [Fact]
    public void Logarithms_of_values_that_are_not_positive_are_listed_cell_by_cell_in_the_files_order()
    {
        var problems = Built.Problems(Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Column("minutes") with { Log = true, Name = "journey" }).ToList();
        Assert.Equal([(3L, "0"), (7L, "-7")], problems.Select(p => (p.Row!.Value, p.Value!)));
        Assert.All(problems, p => Assert.Equal(("term.log_not_positive", "diary.csv", "minutes"), (p.Id, p.File, p.Column)));
        Assert.Contains("term 'journey'", problems[0].Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Only_the_first_twenty_are_listed_with_their_number()
    {
        var lines = string.Join('\n', Enumerable.Range(1, 25).Select(i => $"ann {i} bus minutes=0,2,3"));
        var problems = Built.Problems(Diary.Panel("bus ferry tram", lines), NoRule, Studies.Column("minutes") with { Log = true }).ToList();
        Assert.Equal(21, problems.Count);
        Assert.Contains("25 problems of this kind in all", problems[^1].Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Logarithms_do_not_matter_where_the_alternative_was_not_offered_or_the_term_does_not_enter()
    {
        var panel = Diary.Panel("bus ferry tram", "ann 1 bus minutes=10,0,40 offered=bus,tram\nann 2 bus minutes=5,0,6");
        var log = Studies.Column("minutes") with { Log = true, Alternatives = ["bus", "tram"] };
        Assert.Equal(2, Built.Set(panel, NoRule, log).Used.Length);
    }

    [Fact]
    public void A_lag_that_needs_the_logarithm_of_a_not_offered_nonpositive_value_has_no_history()
    {
        var set = Built.Set(
            Diary.Panel("bus ferry tram", "ann 1 bus minutes=10,0,40 offered=bus,tram\nann 2 bus minutes=5,6,6\nann 3 bus minutes=5,7,6"),
            Studies.History(PreviousRule.Step), Studies.Column("minutes", new Lag(1)) with { Log = true });
        Assert.Equal(["ann 3"], set.Occasions());
    }

    [Theory]
    [InlineData(false, null, "give it each = true and base")]
    [InlineData(true, null, "name the alternative to compare with by base")]
    public void A_person_attribute_has_no_meaning_without_each_and_a_base(bool each, string? @base, string remedy)
    {
        var term = Studies.Column("ticket") with { Each = each, Base = @base, Line = 12 };
        var problem = Assert.Single(Built.Problems(Diary.Panel("bus ferry tram", Ann), NoRule, term));
        Assert.Equal(("term.same_for_all", "study.toml", 12), (problem.Id, problem.File, problem.Line));
        Assert.Contains(remedy, problem.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_constant_for_all_alternatives_has_no_meaning()
    {
        Assert.Equal("term.same_for_all", Assert.Single(Built.Problems(
            Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Term("constant", new ConstantSource()))).Id);
        Assert.Equal("term.same_for_all", Assert.Single(Built.Problems(
            Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Term("constant", new ConstantSource()).Each(null))).Id);
    }

    [Fact]
    public void A_value_that_is_the_same_on_every_day_but_enters_some_alternatives_only_is_fine() =>
        Assert.Single(Built.Set(Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Column("ticket") with { Alternatives = ["tram"] }).Covariates);

    [Fact]
    public void Unknown_alternatives_and_bases_are_named_with_a_suggestion()
    {
        var problems = Built.Problems(
            Diary.Panel("bus ferry tram", Ann), NoRule,
            Studies.Column("minutes") with { Alternatives = ["fery", "bus"], Line = 3 }, Studies.Column("ticket").Each("rickshaw")).ToList();
        Assert.Equal(["study.unknown_alternative", "study.unknown_alternative"], problems.Select(p => p.Id));
        Assert.Contains("did you mean 'ferry'?", problems[0].Sentence, StringComparison.Ordinal);
        Assert.Equal(3, problems[0].Line);
        Assert.Contains("bus, ferry, tram", problems[1].Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Each_over_the_base_alone_leaves_nothing() =>
        Assert.Equal("term.no_alternative", Assert.Single(Built.Problems(
            Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Column("minutes").Each("bus") with { Alternatives = ["bus"] })).Id);

    [Theory]
    [InlineData("Wet", null, "did you mean 'wet'?")]
    [InlineData(null, "dri", "did you mean 'dry'?")]
    [InlineData("thunderstorm", null, "dry, wet")]
    public void A_text_value_that_the_column_never_holds_is_named_with_a_suggestion(string? value, string? omit, string remedy)
    {
        var term = Studies.Term("sky", new ColumnSource("sky", new Now(), value, value is null, omit)).Each("bus");
        var problem = Assert.Single(Built.Problems(Diary.Panel("bus ferry tram", Ann), NoRule, term));
        Assert.Equal("term.unknown_value", problem.Id);
        Assert.Contains(remedy, problem.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Two_coefficients_of_one_name_are_refused() =>
        Assert.Equal("term.name_twice", Assert.Single(Built.Problems(
            Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Column("ticket").Each("bus") with { Name = "sky: wet" },
            Studies.Term("sky", new ColumnSource("sky", new Now(), null, true, "dry")).Each("bus"))).Id);

    [Fact]
    public void Columns_that_the_data_do_not_give_are_named()
    {
        var problems = Built.Problems(
            Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Column("wind"), Studies.Column("minutes") with { Times = "gusts" },
            Studies.Term("season", new ColumnSource("season", new Now(), "spring", false, null))).ToList();
        Assert.Equal(["term.unknown_column", "term.unknown_column", "term.unknown_column"], problems.Select(p => p.Id));
        Assert.Contains("'gusts'", problems[1].Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_term_that_looks_back_needs_a_stated_rule()
    {
        var problem = Assert.Single(Built.Problems(Diary.Panel("bus ferry tram", Ann), NoRule, Studies.Term("last", new LastChoiceSource(1))));
        Assert.Equal("study.no_previous", problem.Id);
    }

    [Theory]
    [InlineData(PreviousRule.Workday, "ann 1 bus", "\"workday\" counts dates")]
    [InlineData(PreviousRule.Day, "ann 1 bus", "\"day\" counts dates")]
    [InlineData(PreviousRule.Week, "ann 1 bus", "\"week\" counts dates")]
    [InlineData(PreviousRule.Step, "ann 2031-03-03 bus", "\"step\" counts whole numbers")]
    public void A_rule_that_does_not_fit_the_occasions_is_refused(PreviousRule rule, string lines, string says)
    {
        var problem = Assert.Single(Built.Problems(Diary.Panel("bus ferry tram", lines), Studies.History(rule), Studies.Term("last", new LastChoiceSource(1))));
        Assert.Equal("study.previous_does_not_fit", problem.Id);
        Assert.Contains(says, problem.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void An_empty_sample_says_why()
    {
        var problem = Assert.Single(Built.Problems(
            Diary.Panel("bus ferry tram", "ann 1 bus\nann 3 bus\nbob 1 bus offered=bus"), Studies.History(PreviousRule.Step), Studies.Term("last", new LastChoiceSource(1))));
        Assert.Equal("sample.empty", problem.Id);
        Assert.Contains(
            "1 only one alternative offered; 1 first recorded occasion of the person: nothing to look back to; 1 no history: no record one step earlier",
            problem.Sentence, StringComparison.Ordinal);
    }
}
