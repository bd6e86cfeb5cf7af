using PanelChoice.Panels;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Panels;

/// <summary>Profiles counted by hand, and one counted by a separate script (plain loops over the rows, no code shared).</summary>
public sealed class PanelProfileTests : IDisposable
{
    // Monday 2031-03-03 to Monday 2031-03-17. Ann: Mon bus, Tue bus, Fri car, next Mon tram (car not offered), Mon after (tram only).
    // Ben: Mon and Tue car. Cy: one day, walking is all there is in the file for nobody else.
    private const string Small = """
        person,day,mode,chosen,on,w,house
        Ann,2031-03-03,bus,1,1,2,red
        Ann,2031-03-03,car,0,1,2,red
        Ann,2031-03-03,tram,0,1,2,red
        Ann,2031-03-04,bus,1,1,2,red
        Ann,2031-03-04,car,0,1,2,red
        Ann,2031-03-07,bus,0,1,2,red
        Ann,2031-03-07,car,1,1,2,red
        Ann,2031-03-10,bus,0,1,2,red
        Ann,2031-03-10,car,0,0,2,red
        Ann,2031-03-10,tram,1,1,2,red
        Ann,2031-03-17,tram,1,1,2,red
        Ben,2031-03-03,car,1,1,1,blue
        Ben,2031-03-03,bus,0,1,1,blue
        Ben,2031-03-04,car,1,1,1,blue
        Ben,2031-03-04,bus,0,1,1,blue
        Cy,2031-03-05,bus,1,1,4.5,red
        Cy,2031-03-05,walk,0,0,4.5,red

        """;

    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    private PanelProfile Profile(string text, Func<string, StudySpecification>? study = null)
    {
        var path = folder.Write("panel.csv", text);
        var specification = study is null ? StudySketch.Over(path, offered: "on") : study(path);
        return PanelProfile.Of(specification, Tables.Panel(specification));
    }

    private PanelProfile Under(PreviousRule? rule) => Profile(Small, p => StudySketch.Over(p, offered: "on", previous: rule));

    [Fact]
    public void Who_is_in_the_panel_and_for_how_long()
    {
        var profile = Under(null);
        Assert.Equal(("panel.csv", 17, 3, 8), (profile.File, profile.Rows, profile.Persons, profile.Occasions));
        Assert.Equal(("2031-03-03", "2031-03-17"), (profile.FirstOccasion, profile.LastOccasion));
        Assert.Equal(new Spread(1, 2, 5), profile.OccasionsPerPerson);
        Assert.Equal(new Spread(1, 2, 3), profile.OfferedAlternatives);
        Assert.Equal(2, profile.SingleAlternativeOccasions);
        Assert.Equal((2, 1), (profile.PersonsWithSeveralOccasions, profile.PersonsNeverSwitching));
        Assert.Null(profile.Weights);
        Assert.Equal(new ClusterProfile("person", 3, new Spread(1, 2, 5)), profile.Clusters);
    }

    [Fact]
    public void What_is_offered_and_chosen() => Assert.Equal(
        [
            new AlternativeProfile("bus", 7, 7 / 8.0, 3, 3 / 8.0, 3 / 7.0, 2),
            new AlternativeProfile("car", 5, 5 / 8.0, 3, 3 / 8.0, 3 / 5.0, 2),
            new AlternativeProfile("tram", 3, 3 / 8.0, 2, 2 / 8.0, 2 / 3.0, 1),
            new AlternativeProfile("walk", 0, 0, 0, 0, null, 0),
        ],
        Under(null).Alternatives.AsEnumerable());

    [Fact]
    public void Gaps_are_counted_in_the_unit_of_the_history_rule()
    {
        // Distances of Ann's days: 1, 3, 3, 7 days; 1, 3, 1, 5 working days. Ben's: 1.
        Assert.Equal(new GapProfile(OccasionUnit.Day, 1, 3, 1, 7), Under(PreviousRule.Day).Gaps);
        Assert.Equal(new GapProfile(OccasionUnit.Workday, 1, 2, 1, 5), Under(PreviousRule.Workday).Gaps);
        Assert.Equal(new GapProfile(OccasionUnit.Workday, 1, 2, 1, 5), Under(PreviousRule.Recorded).Gaps);
        Assert.Equal(new GapProfile(OccasionUnit.Week, 1, 0, 0, 1), Under(PreviousRule.Week).Gaps);
    }

    [Fact]
    public void A_weekend_date_makes_days_the_usual_unit()
    {
        var profile = Profile(Small + "Cy,2031-03-08,bus,1,1,4.5,red\n");
        Assert.Equal(new GapProfile(OccasionUnit.Day, 1, 4, 2, 7), profile.Gaps);
    }

    [Theory]
    [InlineData("1 2 3 6", 1, 1, 3)]
    [InlineData("1 3 5 9", 2, 1, 4)]
    [InlineData("1 3 5 7", 2, 0, 2)]
    [InlineData("4", 1, 0, 0)]
    public void Whole_numbers_are_counted_in_the_step_that_divides_all_distances(string days, long step, int gaps, long longest)
    {
        var rows = string.Concat(days.Split(' ').Select(d => $"1,{d},bus,1\n"));
        var profile = Profile("person,day,mode,chosen\n" + rows, p => StudySketch.Over(p));
        Assert.Equal(new GapProfile(OccasionUnit.WholeNumber, step, gaps, gaps > 0 ? 1 : 0, longest), profile.Gaps);
    }

    [Fact]
    public void Choices_after_the_last_recorded_choice()
    {
        var last = Under(null).LastChoice!;
        Assert.Equal((PreviousRule.Recorded, 5, 3, 0.6, 1), (last.Rule, last.Occasions, last.Repeated, last.RepeatedShare!.Value, last.NotOfferedNow));
        Assert.Equal([1, 1, 0, 0], last.Transitions[0].AsEnumerable());
        Assert.Equal([0, 1, 1, 0], last.Transitions[1].AsEnumerable());
        Assert.Equal([0, 0, 1, 0], last.Transitions[2].AsEnumerable());
        Assert.Equal([0, 0, 0, 0], last.Transitions[3].AsEnumerable());
    }

    [Theory]
    [InlineData(PreviousRule.Day, 2, 2, 0)]
    [InlineData(PreviousRule.Workday, 3, 2, 1)]
    [InlineData(PreviousRule.Week, 2, 1, 0)]
    public void Choices_after_the_last_choice_by_a_calendar_rule(PreviousRule rule, int occasions, int repeated, int notOffered)
    {
        var last = Under(rule).LastChoice!;
        Assert.Equal((rule, occasions, repeated, notOffered), (last.Rule, last.Occasions, last.Repeated, last.NotOfferedNow));
    }

    [Fact]
    public void Weights_and_clusters()
    {
        var profile = Profile(Small, p => StudySketch.Over(p, offered: "on", weight: "w", cluster: "house"));
        Assert.Equal(new WeightProfile("w", 1, 2.5, 4.5), profile.Weights);
        Assert.Equal(new ClusterProfile("house", 2, new Spread(2, 4, 6)), profile.Clusters);
    }

    [Fact]
    public void Without_an_occasion_column_there_is_nothing_to_say_about_time()
    {
        var profile = Profile("person,mode,chosen\n1,bus,1\n1,car,0\n2,bus,0\n2,car,1\n", p => StudySketch.Over(p, occasion: null));
        Assert.Null(profile.FirstOccasion);
        Assert.Null(profile.Gaps);
        Assert.Null(profile.LastChoice);
        Assert.Equal(["panel.one_occasion"], profile.Cautions.Select(c => c.Id));
    }

    [Fact]
    public void Cautions_say_what_to_look_at()
    {
        var profile = Under(null);
        Assert.Equal(
            ["'walk' is in the data but never offered: nothing can be learnt about it.",
             "2 of 8 occasions offer one alternative only: they serve as history and say nothing about preference."],
            profile.Cautions.Select(c => c.Sentence));
    }

    [Theory]
    [InlineData("panel.never_chosen", "1,1,bus,1\n1,1,car,0\n2,1,bus,1\n2,2,bus,1\n")]
    [InlineData("panel.nobody_switches", "1,1,bus,1\n1,2,bus,1\n2,1,car,1\n2,2,car,1\n")]
    [InlineData("panel.names_alike", "1,1,bus,1\n1,1,Bus,0\n")]
    [InlineData("panel.numbers_like_dates", "1,20310430,bus,1\n1,20310501,bus,1\n")]
    [InlineData("panel.one_occasion", "1,1,bus,1\n2,5,bus,1\n")]
    public void Each_caution_has_its_cause(string id, string rows)
    {
        Assert.Contains(id, Profile("person,day,mode,chosen\n" + rows, p => StudySketch.Over(p)).Cautions.Select(c => c.Id));
        Assert.Empty(Profile(
            "person,day,mode,chosen\n1,1,bus,1\n1,1,car,0\n1,2,bus,0\n1,2,car,1\n2,1,bus,1\n2,1,car,0\n", p => StudySketch.Over(p)).Cautions);
    }

    [Fact]
    public void Days_that_are_no_working_days_and_rules_without_any_previous_occasion()
    {
        var weekend = Profile("person,day,mode,chosen\n1,2031-03-07,bus,1\n1,2031-03-08,bus,1\n", p => StudySketch.Over(p, previous: PreviousRule.Workday));
        Assert.Contains("1 of 2 occasions are dated on a week-end or a holiday", Sentence(weekend, "panel.not_working_days"), StringComparison.Ordinal);
        Assert.Contains("previous = \"workday\"", Sentence(weekend, "panel.no_previous"), StringComparison.Ordinal);
        Assert.Equal(new GapProfile(OccasionUnit.Workday, 1, 0, 0, 0), weekend.Gaps);
        static string Sentence(PanelProfile profile, string id) => Assert.Single(profile.Cautions, c => c.Id == id).Sentence;
    }

    [Fact]
    public void One_cluster_for_all()
    {
        var profile = Profile("person,day,mode,chosen,house\n1,1,bus,1,x\n2,1,bus,1,x\n", p => StudySketch.Over(p, cluster: "house"));
        Assert.Contains("panel.one_cluster", profile.Cautions.Select(c => c.Id));
    }

    [Theory]
    [InlineData(PreviousRule.Recorded, 926, 546, 78, "182 22 27 18 23 | 28 52 23 9 6 | 29 27 149 11 25 | 20 9 10 32 22 | 22 3 25 21 131")]
    [InlineData(PreviousRule.Workday, 813, 478, 68, "160 20 22 15 21 | 22 47 22 6 5 | 24 24 127 10 21 | 18 7 10 28 20 | 21 3 23 21 116")]
    [InlineData(PreviousRule.Day, 687, 397, 62, "129 18 21 13 20 | 20 36 21 4 5 | 18 20 108 9 18 | 16 4 7 26 17 | 18 2 19 20 98")]
    [InlineData(PreviousRule.Week, 614, 266, 45, "91 12 35 11 16 | 27 18 22 8 8 | 31 16 74 8 24 | 17 6 11 13 29 | 19 8 26 14 70")]
    public void The_commuter_panel(PreviousRule rule, int pairs, int repeated, int notOffered, string transitions)
    {
        var path = Repository.Fixture("data", "commuter.csv");
        var study = StudySketch.Over(path, occasion: "date", offered: "available", weight: "weight", previous: rule);
        study = study with { Panel = study.Panel with { Alternative = "alt" } };
        var profile = PanelProfile.Of(study, Tables.Panel(study));
        Assert.Equal((4930, 60, 986), (profile.Rows, profile.Persons, profile.Occasions));
        Assert.Equal(("2031-03-03", "2031-03-28"), (profile.FirstOccasion, profile.LastOccasion));
        Assert.Equal(new Spread(1, 17, 20), profile.OccasionsPerPerson);
        Assert.Equal(
            [("bike", 570, 300, 38), ("bus", 934, 122, 37), ("car", 609, 254, 37), ("pool", 861, 95, 35), ("tram", 731, 215, 37)],
            profile.Alternatives.Select(a => (a.Name, a.Offered, a.Chosen, a.PersonsChoosing)));
        Assert.Equal(new Spread(2, 4, 5), profile.OfferedAlternatives);
        Assert.Equal((0, 59, 0), (profile.SingleAlternativeOccasions, profile.PersonsWithSeveralOccasions, profile.PersonsNeverSwitching));
        Assert.Equal((0.437, 2.809), (profile.Weights!.Smallest, profile.Weights.Largest));
        Assert.Equal(1.1669, profile.Weights.Mean, 1e-12);
        if (rule is PreviousRule.Recorded or PreviousRule.Workday) Assert.Equal(new GapProfile(OccasionUnit.Workday, 1, 113, 54, 16), profile.Gaps);
        var last = profile.LastChoice!;
        Assert.Equal((rule, pairs, repeated, notOffered), (last.Rule, last.Occasions, last.Repeated, last.NotOfferedNow));
        Assert.Equal(transitions, string.Join(" | ", last.Transitions.Select(row => string.Join(' ', row))));
    }
}
