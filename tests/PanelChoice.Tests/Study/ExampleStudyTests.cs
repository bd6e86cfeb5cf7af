using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Study;

/// <summary>The documented example, word for word.</summary>
public class ExampleStudyTests
{
    private const string Example = """
        title = "Marrowick crossing, spring wave"

        [panel]
        file        = "crossing.csv"      # .csv, .csv.gz, .parquet
        layout      = "long"              # long: a row per person, occasion and alternative. wide: a row per occasion
        person      = "commuter"
        occasion    = "day"               # whole number, or ISO 8601 date; may be left out when each person has one occasion
        alternative = "mode"              # long only
        chosen      = "taken"             # long: 1/0/true/false. wide: the name of the chosen alternative
        offered     = "running"           # optional: 0 where the alternative was not available
        weight      = "expansion"         # optional: sampling weight, constant within a person
        shared_calendar = true            # is occasion 7 the same day for everybody? default true for dates; must be stated for whole numbers
                                          # before anything common to a day is reported (date score, two-way by occasion, blocks of days)
        # wide only: alternatives = ["drive", "tram", "ferry"], and columns are named by pattern, e.g. "minutes_{alternative}"

        [history]
        previous        = "workday"       # must be stated as soon as a term looks back; there is no silent default
                                          # recorded: the person's previous recorded occasion, whatever the gap
                                          # step: exactly occasion - 1 (whole numbers);  day | workday | week: exactly that far back (dates); another pairing is a problem
        # holidays      = ["2031-04-14"]  # optional, with "workday"
        # longest_gap   = 10              # optional, only with "recorded": further back counts as no history (days for dates, else units of occasion,
                                          # measured from this occasion to the k-th previous)
        without_history = "drop"          # drop: the occasion leaves the sample (it still serves as history). zero: covariates are 0

        [[nest]]
        name    = "river"
        members = ["ferry", "hydrofoil"]  # alternatives or other nests; what is in no nest stands alone under the root
        # dissimilarity = 0.6             # fixed value; default: estimated
        # same_as = "road"                # shares that nest's parameter

        [[term]]                          # one coefficient for all alternatives
        name   = "journey time"
        column = "minutes"

        [[term]]                          # one constant for each alternative but the base
        name     = "constant"
        constant = true
        each     = true
        base     = "drive"

        [[term]]
        name         = "fare"
        column       = "fare"
        alternatives = ["tram", "ferry", "hydrofoil"]

        [[term]]                          # a person attribute has no meaning without each
        name   = "season ticket"
        column = "ticket"
        each   = true
        base   = "drive"

        [[term]]                          # lagged attribute: this alternative's value at the previous occasion
        name   = "last delay"
        column = "delay"
        lag    = 1

        [[term]]                          # lagged choice: 1 for the alternative chosen at the previous occasion
        name        = "same as last time"
        last_choice = 1                   # with each = true: habit by mode

        [[term]]                          # a text column: 1 where it equals the value
        name   = "Monday"
        column = "weekday"
        is     = "Mon"                    # or levels = true with omit = "Mon": one indicator per other value
        each   = true
        base   = "drive"

        [estimate]
        form   = "utility-scaled"         # or "unscaled", section 6
        starts = 20                       # 1 = only from plain logit
        seed   = 7

        [inference]
        cluster        = "person"         # or any column constant within a person (household)
        second_cluster = "occasion"       # optional: two-way
        confidence     = 0.95
        jackknife      = "auto"           # refit | one_step | off; auto: refit up to 1,000 clusters, one_step (labelled so) beyond
        [inference.bootstrap]
        replicates = 399                  # the default; 0 = none
        blocks     = "cluster"            # or "moving" with length = 5 (stretches of occasions inside a person)
        seed       = 7

        [diagnostics]
        lags  = 5
        level = 0.05
        draws = 9999                      # for the detector's p-value
        seed  = 7
        """;

    [Fact]
    public void The_documented_example_is_good()
    {
        var study = StudyText.Good(Example);
        Assert.Equal("occasion", study.Inference.SecondCluster);
        Assert.Equal("Marrowick crossing, spring wave", study.Title);
        Assert.Equal(7, study.Terms.Length);
        Assert.Equal(PreviousRule.Workday, study.History.Previous);
        Assert.Equal("river", Assert.Single(study.Nests).Name);
        Assert.Equal(399, study.Inference.Replicates);
    }

    [Fact]
    public void The_wide_form_of_the_example_is_refused_by_name() =>
        Assert.Contains(
            StudyText.Read(Example.Replace("layout      = \"long\"", "layout = \"wide\"", StringComparison.Ordinal)).Problems,
            p => p.Id == "study.not_supported" && p.Sentence.Contains("wide layout", StringComparison.Ordinal));

    [Fact]
    public void A_nest_of_the_example_becomes_a_tree()
    {
        var study = StudyText.Good(Example);
        var tree = NestTreeBuilder.Build(study, ["drive", "tram", "ferry", "hydrofoil"]).Value!;
        Assert.Equal(["river", ""], tree.Nodes.Select(n => n.Name));
    }
}
