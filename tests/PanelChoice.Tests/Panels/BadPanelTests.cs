using System.Collections.Immutable;
using PanelChoice.Panels;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Panels;

/// <summary>Every way in which rows that read well make no panel: id, row, column, value, and one clear line.</summary>
public sealed class BadPanelTests : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    private ImmutableArray<Problem> Problems(string text, Func<string, StudySpecification>? study = null)
    {
        var path = folder.Write("panel.csv", text);
        var specification = study is null ? StudySketch.Over(path) : study(path);
        var problems = ChoicePanelBuilder.Build(specification, Tables.Read(specification)).Problems;
        Assert.All(problems, p => Assert.DoesNotContain('\n', p.Sentence));
        return problems;
    }

    private void ExpectOne(string text, Func<string, StudySpecification>? study, string id, long? row, string? column, string? value, string sentence)
    {
        var problem = Assert.Single(Problems(text, study));
        Assert.Equal((id, row, column, value), (problem.Id, problem.Row, problem.Column, problem.Value));
        Assert.Equal(sentence, problem.Sentence);
    }

    [Fact]
    public void The_same_alternative_twice() => ExpectOne(
        "person,day,mode,chosen\nP1,2031-03-03,bus,1\nP1,2031-03-03,car,0\nP1,2031-03-03,bus,1\n", null,
        "data.duplicate", 4, "mode", "bus",
        "panel.csv, row 4, column 'mode', value 'bus': person 'P1' at occasion 2031-03-03 has this alternative already in row 2; keep one row for each person, occasion and alternative.");

    [Fact]
    public void A_column_with_thousands_of_alternatives() => ExpectOne(
        "person,day,mode,chosen\n" + string.Concat(Enumerable.Range(1, 1001).Select(i => $"P{i},1,m{i},1\n")), null,
        "data.too_many_alternatives", null, "mode", null,
        "panel.csv, column 'mode': the column holds 1,001 alternatives, and a panel can have 1,000; name the column of alternatives under [panel] alternative, or join alternatives.");

    [Fact]
    public void Each_further_row_of_the_same_alternative_is_told() =>
        Assert.Equal([3L, 4L], Problems("person,day,mode,chosen\nP1,1,bus,1\nP1,1,bus,0\nP1,1,bus,0\n").Select(p => p.Row!.Value));

    [Fact]
    public void Several_occasions_without_an_occasion_column() => ExpectOne(
        "person,mode,chosen\nP1,bus,1\nP1,car,0\nP1,bus,0\nP1,car,1\n", p => StudySketch.Over(p, occasion: null),
        "data.several_occasions", 4, "mode", "bus",
        "panel.csv, row 4, column 'mode', value 'bus': person 'P1' has this alternative already in row 2, as on several occasions; name the column of occasions under [panel] occasion, or keep one row for each person and alternative.");

    [Fact]
    public void Nothing_chosen() => ExpectOne(
        "person,day,mode,chosen\nP1,1,bus,1\nP1,2,car,0\nP1,2,bus,0\n", null,
        "data.none_chosen", 3, "chosen", null,
        "panel.csv, row 3, column 'chosen': person 'P1' at occasion 2 chose nothing, here or in the rows that belong to it; mark the chosen row, or take the occasion out.");

    [Fact]
    public void Several_chosen() => ExpectOne(
        "person,day,mode,chosen\nP1,1,bus,1\nP1,1,car,1\n", null,
        "data.several_chosen", 3, "chosen", "1",
        "panel.csv, row 3, column 'chosen', value '1': person 'P1' at occasion 1 chose both 'car' and 'bus' (row 2); mark exactly one row of an occasion as chosen.");

    [Fact]
    public void Chosen_but_not_offered() => ExpectOne(
        "person,day,mode,chosen,on\nP1,1,bus,1,0\nP1,1,car,0,1\n", p => StudySketch.Over(p, offered: "on"),
        "data.chosen_not_offered", 2, "on", "0",
        "panel.csv, row 2, column 'on', value '0': person 'P1' at occasion 1 chose 'bus', which is marked as not offered; mark it as offered, or correct the choice.");

    [Theory]
    [InlineData("0")]
    [InlineData("-1.5")]
    public void A_weight_that_is_not_positive(string weight) => ExpectOne(
        $"person,day,mode,chosen,w\nP1,1,bus,1,{weight}\n", p => StudySketch.Over(p, weight: "w"),
        "data.weight_not_positive", 2, "w", weight,
        $"panel.csv, row 2, column 'w', value '{weight}': a sampling weight must be above 0; give the weight, or take the person out.");

    [Fact]
    public void A_weight_that_changes_within_a_person_is_told_once() => ExpectOne(
        "person,day,mode,chosen,w\nP1,1,bus,1,2\nP1,2,bus,1,2.5\nP1,3,bus,1,3\nP2,1,bus,1,7\n", p => StudySketch.Over(p, weight: "w"),
        "data.weight_not_constant", 3, "w", "2.5",
        "panel.csv, row 3, column 'w', value '2.5': person 'P1' has weight 2 in row 2; give each person one weight.");

    [Fact]
    public void A_cluster_that_changes_within_a_person_is_told_once() => ExpectOne(
        "person,day,mode,chosen,house\nP1,1,bus,1,red\nP1,2,bus,1,blue\nP1,3,bus,1,blue\n", p => StudySketch.Over(p, cluster: "house"),
        "data.cluster_not_constant", 3, "house", "blue",
        "panel.csv, row 3, column 'house', value 'blue': person 'P1' is in cluster 'red' in row 2; cluster by a column that does not change within a person.");

    [Fact]
    public void A_nest_that_lists_an_alternative_the_data_do_not_have()
    {
        var problem = Assert.Single(Problems(
            "person,day,mode,chosen\nP1,1,bus,1\nP1,1,ferry,0\n", p => StudySketch.Over(p, nests: [new NestSpecification("river", ["fery", "bus"], null, null, 12)])));
        Assert.Equal(("study.unknown_member", "study.toml", 12, "fery"), (problem.Id, problem.File, problem.Line, problem.Value));
        Assert.Contains("did you mean 'ferry'?", problem.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Terms_that_name_alternatives_the_data_do_not_have()
    {
        ImmutableArray<TermSpecification> terms =
        [
            StudySketch.Term("fare", new ConstantSource(), 31) with { Alternatives = ["bus", "trolley"] },
            StudySketch.Term("constant", new ConstantSource(), 35) with { Each = true, Base = "Car" },
        ];
        var problems = Problems("person,day,mode,chosen\nP1,1,bus,1\nP1,1,car,0\n", p => StudySketch.Over(p, terms));
        Assert.Equal(
            ["study.toml, line 31, value 'trolley': the term 'fare' names an alternative that panel.csv does not have; use one of: bus, car.",
             "study.toml, line 35, value 'Car': the base of the term 'constant' names an alternative that panel.csv does not have; did you mean 'car'?"],
            problems.Select(p => p.Sentence));
        Assert.All(problems, p => Assert.Equal("study.unknown_alternative", p.Id));
    }

    [Theory]
    [InlineData(PreviousRule.Day, "day")]
    [InlineData(PreviousRule.Workday, "workday")]
    [InlineData(PreviousRule.Week, "week")]
    public void A_calendar_rule_on_whole_numbers(PreviousRule rule, string word)
    {
        var problem = Assert.Single(Problems("person,day,mode,chosen\nP1,1,bus,1\n", p => StudySketch.Over(p, previous: rule)));
        Assert.Equal("study.previous_does_not_fit", problem.Id);
        Assert.Equal(
            $"study.toml, line 3, value '{word}': this rule needs occasions that are dates, and column 'day' of panel.csv holds whole numbers; use previous = \"step\" or \"recorded\", or write the occasions as dates like 2031-04-14.",
            problem.Sentence);
    }

    [Fact]
    public void A_step_between_dates()
    {
        var problem = Assert.Single(Problems("person,day,mode,chosen\nP1,2031-04-14,bus,1\n", p => StudySketch.Over(p, previous: PreviousRule.Step)));
        Assert.Equal(
            "study.toml, line 3, value 'step': this rule needs occasions that are whole numbers, and column 'day' of panel.csv holds dates; use previous = \"day\", \"workday\", \"week\" or \"recorded\".",
            problem.Sentence);
    }

    [Theory]
    [InlineData(PreviousRule.Step, "3")]
    [InlineData(PreviousRule.Recorded, "3")]
    [InlineData(PreviousRule.Recorded, "2031-04-14")]
    [InlineData(PreviousRule.Day, "2031-04-14")]
    [InlineData(PreviousRule.Workday, "2031-04-14")]
    [InlineData(PreviousRule.Week, "2031-04-14")]
    public void Rules_that_fit(PreviousRule rule, string day) =>
        Assert.Empty(Problems($"person,day,mode,chosen\nP1,{day},bus,1\n", p => StudySketch.Over(p, previous: rule)));

    [Fact]
    public void Twenty_of_a_kind_are_listed_and_the_total_is_said()
    {
        var rows = string.Concat(Enumerable.Range(1, 50).Select(i => $"{i},1,bus,0\n{i},2,bus,1\n{i},2,bus,1\n"));
        var problems = Problems("person,day,mode,chosen\n" + rows);
        Assert.Equal(42, problems.Length);
        Assert.Equal(50, problems.Where(p => p.Id == "data.none_chosen").Max(p => p.Total));
        Assert.Equal(50, problems.Where(p => p.Id == "data.duplicate").Max(p => p.Total));
    }
}
