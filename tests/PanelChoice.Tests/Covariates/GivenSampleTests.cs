using PanelChoice.Covariates;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Covariates;

/// <summary>Other terms on a sample that is already decided.</summary>
public class GivenSampleTests
{
    private static readonly TermSpecification Last = Studies.Term("last", new LastChoiceSource(1));
    private static readonly TermSpecification Mean = Studies.Column("minutes", new PersonMean());

    private const string Ann = """
        ann 1 bus minutes=100,100,100
        ann 2 bus minutes=1,10,30
        ann 3 tram minutes=3,20,50
        ann 5 tram minutes=3,20,50
        """;

    [Fact]
    public void The_given_sample_is_kept_and_the_means_are_taken_over_it()
    {
        var panel = Diary.Panel("bus ferry tram", Ann);
        var study = Studies.With(Studies.History(PreviousRule.Step), Last);
        var tree = SyntheticPanel.TreeOf(panel.Alternatives, []);
        var sample = CovariateBuilder.Build(study, panel, tree).Value!;
        var other = CovariateBuilder.BuildOn(study, panel, tree, [Studies.Column("minutes"), Mean with { Name = "mean" }], sample.Used).Value!;
        Assert.Equal(["ann 2", "ann 3"], other.Occasions());
        Assert.Equal(["1 10 30", "3 20 50"], other.Shown("minutes"));
        Assert.Equal(["2 15 40", "2 15 40"], other.Shown("mean"));
        Assert.Equal(["2 not in the given sample"], other.Reasons());
    }

    [Fact]
    public void Means_leave_out_the_first_occasion_when_the_study_looks_back_although_the_given_terms_do_not()
    {
        var panel = Diary.Panel("bus ferry tram", Ann);
        var study = Studies.With(Studies.History(PreviousRule.Step, MissingHistory.Zero), Last);
        var other = CovariateBuilder.BuildOn(study, panel, SyntheticPanel.TreeOf(panel.Alternatives, []), [Mean], [0, 1, 2]).Value!;
        Assert.Equal(["2 15 40", "2 15 40", "2 15 40"], other.Shown("minutes"));
    }

    [Fact]
    public void A_term_without_its_history_on_the_given_sample_is_a_problem_and_never_a_silent_zero()
    {
        var panel = Diary.Panel("bus ferry tram", Ann);
        var study = Studies.With(Studies.History(PreviousRule.Step), Studies.Column("minutes"));
        var other = CovariateBuilder.BuildOn(study, panel, SyntheticPanel.TreeOf(panel.Alternatives, []), [Last], [0, 1, 2, 3]);
        var problem = Assert.Single(other.Problems);
        Assert.Equal("term.value_missing", problem.Id);
        Assert.Contains("2 used occasions", problem.Sentence, StringComparison.Ordinal);
    }
}
