using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Findings;

/// <summary>Which findings are drawn from which figures, and in which words.</summary>
public class FindingTests
{
    private static readonly FindingsInput Many = HandMadeStages.Many;

    [Fact]
    public void Nothing_found_is_never_called_independent()
    {
        var said = Say(Many with { Diagnostics = HandMadeStages.Quiet }, FindingTopic.Independence);
        Assert.Equal("independence.none_found", said[0].Id);
        Assert.Contains("No sign of dependence", said[0].Sentence, StringComparison.Ordinal);
        Assert.Contains("no proof", said[0].Sentence, StringComparison.Ordinal);
        Assert.DoesNotContain(said, f => f.Sentence.Contains("are independent", StringComparison.Ordinal));
    }

    [Theory]
    [InlineData(DependenceCause.Taste, "lasting taste")]
    [InlineData(DependenceCause.Habit, "habit that works in another way than the habit terms say")]
    [InlineData(DependenceCause.HabitAndTaste, "habit and lasting taste together")]
    [InlineData(DependenceCause.SerialErrors, "fade slowly")]
    [InlineData(DependenceCause.Unclear, "cause cannot be told")]
    public void Dependence_is_said_with_its_likely_cause(DependenceCause cause, string words)
    {
        var verdict = Say(Many with { Diagnostics = HandMadeStages.Taste with { Cause = cause } }, FindingTopic.Independence)[0];
        Assert.Equal(FindingSeverity.Warning, verdict.Severity);
        Assert.Contains(words, verdict.Sentence, StringComparison.Ordinal);
        Assert.Contains("detector p = 0.0001", verdict.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Habit_is_called_left_out_only_where_no_term_holds_any()
    {
        var layout = Many.Model.Layout;
        var present = layout with { Parameters = [.. layout.Parameters.Select(p => p with { Role = CovariateRole.Present })] };
        var likelihood = new PanelChoice.Likelihood.ScalarNestedLogit(Many.Model.Design with { Layout = present }, NestedLogitForm.UtilityScaled, 1);
        var stages = Many with { Model = Many.Model with { Likelihood = likelihood }, Diagnostics = HandMadeStages.Taste with { Cause = DependenceCause.Habit } };
        Assert.Contains("habit that the terms do not hold", Say(stages, FindingTopic.Independence)[0].Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Where_only_the_date_score_passes_people_are_moved_by_the_same_days()
    {
        var verdict = Say(Many with { Diagnostics = HandMadeStages.Taste with { Cause = null, CommonDays = true } }, FindingTopic.Independence)[0];
        Assert.Contains("people are moved by the same days", verdict.Sentence, StringComparison.Ordinal);
        Assert.DoesNotContain("Its likely cause", verdict.Sentence, StringComparison.Ordinal);
        Assert.Contains(FindingList.Of(Many with { Diagnostics = HandMadeStages.Taste with { Cause = null, CommonDays = true } }), f => f.Id == "advice.common_days");
    }

    [Fact]
    public void Common_days_beside_another_cause_are_said_as_well()
    {
        var verdict = Say(Many with { Diagnostics = HandMadeStages.Taste with { CommonDays = true } }, FindingTopic.Independence)[0];
        Assert.Contains("lasting taste", verdict.Sentence, StringComparison.Ordinal);
        Assert.Contains("moved by the same days", verdict.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Where_nothing_can_be_tested_the_reason_is_given()
    {
        var none = HandMadeStages.Quiet with { Verdict = Verdict.NotApplicable, Reason = "Each person has one occasion." };
        Assert.Contains("Each person has one occasion.", Say(Many with { Diagnostics = none }, FindingTopic.Independence)[0].Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void With_a_hundred_clusters_or_more_the_clustered_error_is_advised_and_below_the_jackknife()
    {
        Assert.Contains(FindingList.Of(Many), f => f.Id == "advice.cluster" && f.Sentence.Contains("119 degrees of freedom", StringComparison.Ordinal));
        var few = FindingList.Of(HandMadeStages.Fourteen);
        Assert.Contains(few, f => f.Id == "advice.jackknife" && f.Sentence.Contains("13 degrees of freedom", StringComparison.Ordinal));
        Assert.Contains(few, f => f.Id == "precision.jackknife");
        Assert.DoesNotContain(few, f => f.Id == "advice.cluster");
    }

    [Fact]
    public void With_few_clusters_and_no_jackknife_the_clustered_intervals_are_called_a_lower_bound()
    {
        var stages = HandMadeStages.Fourteen;
        var refused = stages.Inference.Covariances[CovarianceKind.Jackknife] with { Matrix = null, Refusal = "A refit failed." };
        var few = FindingList.Of(stages with
        {
            Inference = stages.Inference with
            {
                Covariances = stages.Inference.Covariances.SetItem(CovarianceKind.Jackknife, refused),
                Parameters = [.. stages.Inference.Parameters.Select(p => Without(Without(p, CovarianceKind.Jackknife, "A refit failed."), CovarianceKind.BiasReduced, "It cannot be adjusted."))],
            },
        });
        Assert.Contains(few, f => f.Id == "advice.lower_bound" && f.Sentence.Contains("There is no jackknife one: A refit failed.", StringComparison.Ordinal));
        Assert.Contains(few, f => f.Id == "precision.refused" && f.Sentence.Contains("A refit failed.", StringComparison.Ordinal));
    }

    [Fact]
    public void With_one_cluster_no_clustered_interval_is_advised()
    {
        var stages = HandMadeStages.Fourteen;
        var one = FindingList.Of(stages with { Inference = stages.Inference with { Clusters = stages.Inference.Clusters with { Count = 1 } } });
        Assert.Contains(one, f => f.Id == "advice.one_cluster" && f.Sentence.StartsWith("All occasions belong to one person,", StringComparison.Ordinal));
        Assert.DoesNotContain(one, f => f.Id is "advice.lower_bound" or "advice.jackknife");
    }

    [Fact]
    public void A_nest_is_not_judged_by_where_a_search_without_a_maximum_stood()
    {
        var stages = HandMadeStages.Fourteen;
        var none = stages with { Model = stages.Model with { Status = FitStatus.Boundary } };
        Assert.Contains(FindingList.Of(stages), f => f.Topic == FindingTopic.Nests && f.Id != "nests.no_estimate");
        Assert.All(FindingList.Of(none).Where(f => f.Topic == FindingTopic.Nests), f => Assert.Equal("nests.no_estimate", f.Id));
    }

    [Fact]
    public void With_one_cluster_the_refusal_of_a_clustered_error_is_told()
    {
        var stages = HandMadeStages.Fourteen;
        var alone = FindingList.Of(stages with
        {
            Inference = stages.Inference with
            {
                Covariances = stages.Inference.Covariances
                    .SetItem(CovarianceKind.Cluster, CovarianceEstimate.Refused(CovarianceKind.Cluster, "There is one cluster only."))
                    .SetItem(CovarianceKind.Jackknife, CovarianceEstimate.Refused(CovarianceKind.Jackknife, "There is one cluster only.")),
                Parameters = [.. stages.Inference.Parameters.Select(p => p with { SeRatio = null, EquivalentOccasions = null, JackknifeSeRatio = null })],
                Clusters = stages.Inference.Clusters with { Count = 1, DegreesOfFreedom = 0, MostInfluential = [] },
            },
        });
        Assert.Contains(alone, f => f.Id == "advice.one_cluster");
        Assert.DoesNotContain(alone, f => f.Id == "advice.lower_bound");
        Assert.Contains(alone, f => f.Id == "precision.refused" && f.Sentence.Contains("one cluster only", StringComparison.Ordinal));
    }

    [Fact]
    public void Failed_replicates_lean_on_no_figure_where_the_bootstrap_is_refused_for_them()
    {
        var bootstrap = Many.Inference.Bootstrap! with { Done = 18, Failures = [new ReplicateFailures("boundary", 1, [3])] };
        var kept = Many with { Inference = Many.Inference with { Bootstrap = bootstrap } };
        Assert.Contains(FindingList.Of(kept), f => f.Id == "advice.failed_replicates");
        var refused = CovarianceEstimate.Refused(CovarianceKind.Bootstrap, "Too many replicates failed.");
        var without = FindingList.Of(kept with
        {
            Inference = kept.Inference with { Covariances = kept.Inference.Covariances.SetItem(CovarianceKind.Bootstrap, refused) },
        });
        Assert.DoesNotContain(without, f => f.Id == "advice.failed_replicates");
        Assert.Contains(without, f => f.Id == "precision.refused" && f.Sentence.Contains("Too many replicates failed", StringComparison.Ordinal));
    }

    [Fact]
    public void What_a_clustered_error_does_not_repair_is_said_where_dependence_was_found_and_only_there()
    {
        Assert.Contains(FindingList.Of(Many), f => f.Id == "advice.not_repaired");
        Assert.DoesNotContain(FindingList.Of(Many with { Diagnostics = HandMadeStages.Quiet }), f => f.Id == "advice.not_repaired");
    }

    [Fact]
    public void A_habit_coefficient_is_called_an_upper_bound_only_where_no_lag_jumps_a_gap()
    {
        static string NotRepaired(FindingsInput stages) => FindingList.Of(stages).Single(f => f.Id == "advice.not_repaired").Sentence;

        Assert.Contains("upper bound", NotRepaired(Many), StringComparison.Ordinal);
        var jumping = Many with { Sample = Many.Sample with { Cautions = [new Caution("history.gaps", "Lags jump gaps.")] } };
        Assert.DoesNotContain("upper bound", NotRepaired(jumping), StringComparison.Ordinal);
        Assert.Contains("settled", NotRepaired(jumping), StringComparison.Ordinal);
    }

    [Fact]
    public void The_three_cautions_are_always_said()
    {
        foreach (var stages in new[] { Many, HandMadeStages.Fourteen, Many with { Model = Many.Model with { Status = FitStatus.Stopped } } })
            Assert.Equal(
                ["caution.interval", "caution.personal_data", "caution.forecast"],
                FindingList.Of(stages).Where(f => f.Topic == FindingTopic.Caution).Select(f => f.Id));
    }

    [Fact]
    public void A_habit_term_is_told_with_its_interval_and_direction()
    {
        var habit = Say(Many, FindingTopic.Past).Single(f => f.Id == "past.habit");
        Assert.Contains("'same as last time', the alternative taken last time: ", habit.Sentence, StringComparison.Ordinal);
        Assert.Contains("more attractive now", habit.Sentence, StringComparison.Ordinal);
        Assert.Equal(3, habit.Figures.Length);
        // In a nested model the coefficient does not multiply the odds against every other alternative, so no odds are given.
        Assert.DoesNotContain("odds", habit.Sentence, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData(-1.0, "less attractive now")]
    [InlineData(0.0, "do not show which way")]
    [InlineData(1.0, "more attractive now")]
    public void The_direction_follows_the_interval_not_the_estimate(double centre, string words)
    {
        var habit = Say(WithFigures(5, new KindFigures(0.1, new Interval(centre - 0.2, centre + 0.2), 0.5, null)), FindingTopic.Past)[0];
        Assert.Contains(words, habit.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Without_an_interval_nothing_is_said_of_the_direction()
    {
        var habit = Say(WithFigures(5, new KindFigures(null, null, null, "There is one cluster only.")), FindingTopic.Past)[0];
        Assert.Contains("has no interval", habit.Sentence, StringComparison.Ordinal);
        Assert.DoesNotContain("holds 0", habit.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Odds_are_given_only_in_plain_logit()
    {
        var stages = WithFigures(5, new KindFigures(0.1, new Interval(0.5, 1), 0.01, null));
        var plain = PastFindings.Of(stages with { Study = stages.Study with { Nests = [] } }).First();
        Assert.Contains($"by {PlainNumber.Ratio(Math.Exp(stages.Model.Parameters[5]))} (1.65 to 2.72)", plain.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_model_that_does_not_look_back_says_so()
    {
        var layout = Many.Model.Layout;
        var present = Many.Model.Layout with { Parameters = [.. layout.Parameters.Select(p => p with { Role = CovariateRole.Present })] };
        var likelihood = new PanelChoice.Likelihood.ScalarNestedLogit(Many.Model.Design with { Layout = present }, NestedLogitForm.UtilityScaled, 1);
        Assert.Equal("past.none", Say(Many with { Model = Many.Model with { Likelihood = likelihood } }, FindingTopic.Past).Single().Id);
    }

    [Theory]
    [InlineData(0.6, 0.001, "nests.consistent", "more readily than others do")]
    [InlineData(0.9, 0.4, "nests.consistent", "do not show")]
    [InlineData(1.2, 0.3, "nests.above", "within error of it")]
    [InlineData(1.9, 0.001, "nests.inconsistent", "not consistent with utility maximisation")]
    [InlineData(1.0, 1.0, "nests.dissolved", "changes nothing")]
    public void A_nest_is_judged_against_its_limit(double l, double p, string id, string words)
    {
        var at = Many.Layout.Nests[0].Parameter;
        var stages = WithFigures(at, new KindFigures(0.1, new Interval(l * 0.8, l * 1.25), p, null));
        stages = stages with { Model = stages.Model with { Parameters = stages.Model.Parameters.SetItem(at, l) } };
        var said = Say(stages, FindingTopic.Nests)[0];
        Assert.Equal(id, said.Id);
        Assert.Contains(words, said.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_nest_below_a_parent_above_one_is_not_called_consistent()
    {
        var made = SyntheticPanel.Make(3, 20, 6, 4, [SyntheticPanel.Nest("outer", "A", "inner"), SyntheticPanel.Nest("inner", "B", "C")], [0.6, 0.5]);
        var (model, _) = PanelChoice.Tests.Inference.NewtonRefitter.Fit(made.Design(), made.Truth);
        var (outer, inner) = (model.Layout.Nests[0].Parameter, model.Layout.Nests[1].Parameter);
        string IdOfInner(double parent) => NestFindings.Of(Many with
        {
            Study = Many.Study with { Nests = made.Nests }, Model = model with { Parameters = model.Parameters.SetItem(outer, parent).SetItem(inner, 0.7) },
        }).Single(f => f.Sentence.StartsWith("'inner'", StringComparison.Ordinal)).Id;
        Assert.Equal("nests.below_parent", IdOfInner(1.2));
        Assert.Equal("nests.consistent", IdOfInner(0.9));
    }

    [Fact]
    public void The_headline_on_precision_gives_habit_median_and_largest_and_says_that_it_describes()
    {
        var said = Say(Many, FindingTopic.Precision);
        Assert.Equal(["precision.habit", "precision.overall"], said.Take(2).Select(f => f.Id));
        var ratios = Many.Inference.Parameters.Select(p => p.SeRatio!.Value).Order().ToList();
        Assert.Equal(ratios[^1], said[1].Figures.Single(f => f.Name == "largest").Value);
        Assert.Contains("the test is the detector", said[1].Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_person_that_moves_a_term_is_named_by_pseudonym()
    {
        var stages = Many with
        {
            Inference = Many.Inference with { Clusters = Many.Inference.Clusters with { MostInfluential = [new Influence(3, 5, 4)] } },
        };
        var said = FindingList.Of(stages).Single(f => f.Id == "precision.influential");
        Assert.Matches("^Without person [0-9a-f]{6,} ", said.Sentence);
    }

    [Fact]
    public void Pseudonyms_are_stable_differ_between_files_and_between_ids()
    {
        var ids = Enumerable.Range(0, 5000).Select(i => "id " + i).ToImmutableArray();
        var one = Pseudonyms.Of("aa", ids);
        Assert.Equal(one.AsEnumerable(), Pseudonyms.Of("aa", ids).AsEnumerable());
        Assert.Equal(ids.Length, one.Distinct().Count());
        Assert.Empty(one.Intersect(Pseudonyms.Of("ab", ids)).Skip(5));
        Assert.DoesNotContain(ids, id => one.Contains(id));
    }

    private static ImmutableArray<Finding> Say(FindingsInput stages, FindingTopic topic) => [.. FindingList.Of(stages).Where(f => f.Topic == topic)];

    private static FindingsInput WithFigures(int parameter, KindFigures figures) => Many with
    {
        Inference = Many.Inference with
        {
            Parameters = [.. Many.Inference.Parameters.Select(p => p.Parameter == parameter ? p with { ByKind = p.ByKind.SetItem(CovarianceKind.Cluster, figures) } : p)],
        },
    };

    private static ParameterInference Without(ParameterInference parameter, CovarianceKind kind, string reason) =>
        parameter with { ByKind = parameter.ByKind.SetItem(kind, new KindFigures(null, null, null, reason)) };
}
