using System.Collections.Immutable;
using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Findings;

/// <summary>The rules that choose a standard error for each term.</summary>
public class RecommendationTests
{
    [Fact]
    public void Many_clusters_call_for_the_clustered_error_and_fewer_for_the_jackknife()
    {
        Assert.All(HandMadeStages.Many.Recommendations, r => Assert.Equal((CovarianceKind.Cluster, "many_clusters"), (r.Kind!.Value, r.Rule)));
        Assert.All(HandMadeStages.Fourteen.Recommendations, r => Assert.Equal((CovarianceKind.Jackknife, "some_clusters"), (r.Kind!.Value, r.Rule)));
    }

    [Fact]
    public void The_figures_are_those_of_the_kind_and_the_interval_is_the_critical_value_wide()
    {
        foreach (var stages in new[] { HandMadeStages.Many, HandMadeStages.Fourteen })
            foreach (var r in stages.Recommendations)
            {
                var figures = stages.Figures(r.Parameter, r.Kind!.Value)!;
                Assert.Equal((figures.StandardError, figures.Interval, figures.PValue), (r.StandardError, r.Interval, r.PValue));
                Assert.Equal(stages.Inference.Clusters.Count - 1, r.DegreesOfFreedom);
                if (stages.Layout.Parameters[r.Parameter].Kind == PanelChoice.Design.ParameterKind.Coefficient)
                    Assert.Equal(r.Interval!.High - r.Interval.Low, 2 * r.Critical!.Value * r.StandardError!.Value, 1e-9);
            }
    }

    [Fact]
    public void On_common_days_the_wider_of_the_two_way_and_the_jackknife_interval_is_reported()
    {
        var stages = HandMadeStages.Many with { Diagnostics = HandMadeStages.Quiet with { CommonDays = true } };
        var (first, second) = (stages.Inference.Parameters[0], stages.Inference.Parameters[1]);
        var parameters = stages.Inference.Parameters.SetItem(0, TwoWay(first, 3)).SetItem(1, TwoWay(second, 0.5));
        var twoWay = stages.Inference.Covariances[CovarianceKind.Cluster] with { Kind = CovarianceKind.TwoWay, DegreesOfFreedom = 7 };
        var recommended = (stages with
        {
            Inference = stages.Inference with { Parameters = parameters, Covariances = stages.Inference.Covariances.SetItem(CovarianceKind.TwoWay, twoWay) },
        }).Recommendations;
        Assert.Equal(("common_days", CovarianceKind.TwoWay, 7.0), (recommended[0].Rule, recommended[0].Kind!.Value, recommended[0].DegreesOfFreedom!.Value));
        Assert.Equal("many_clusters", recommended[1].Rule);
    }

    [Fact]
    public void A_term_without_the_figure_that_its_rule_wants_says_so_and_takes_the_next()
    {
        var stages = HandMadeStages.Fourteen;
        var parameters = stages.Inference.Parameters.SetItem(
            0, stages.Inference.Parameters[0] with
            {
                ByKind = stages.Inference.Parameters[0].ByKind.SetItem(CovarianceKind.Jackknife, new KindFigures(null, null, null, "Without one person it is lost.")),
            });
        var lost = stages with { Inference = stages.Inference with { Parameters = parameters } };
        var recommended = lost.Recommendations[0];
        Assert.Equal(("some_clusters_no_refits", CovarianceKind.BiasReduced), (recommended.Rule, recommended.Kind!.Value));
        Assert.Equal(lost.Inference.Covariances[CovarianceKind.BiasReduced].DegreesOf(0), recommended.DegreesOfFreedom);
        Assert.StartsWith("There is no jackknife one: Without one person it is lost.", recommended.Why, StringComparison.Ordinal);
        Assert.Contains(FindingList.Of(lost), f => f.Id == "advice.bias_reduced");
        Assert.Contains(FindingList.Of(lost), f => f.Id == "advice.jackknife");
    }

    [Fact]
    public void A_term_that_is_lost_without_one_person_is_told_to_have_no_standard_error()
    {
        var stages = HandMadeStages.Fourteen;
        var first = stages.Inference.Parameters[0];
        var lost = stages with
        {
            Inference = stages.Inference with
            {
                Parameters = stages.Inference.Parameters.SetItem(
                    0, first with { ByKind = first.ByKind.SetItem(CovarianceKind.Jackknife, new KindFigures(null, null, null, "Without person P3 it cannot be estimated.")) }),
                Covariances = stages.Inference.Covariances.SetItem(
                    CovarianceKind.Jackknife, stages.Inference.Covariances[CovarianceKind.Jackknife] with { RefusedParameters = [0], RefusedReasons = ["Without person P3 it cannot be estimated."] }),
            },
        };
        var recommended = lost.Recommendations[0];
        Assert.Equal("rests_on_one_cluster", recommended.Rule);
        Assert.Null(recommended.Kind);
        Assert.StartsWith("Without person P3 it cannot be estimated.", recommended.Why, StringComparison.Ordinal);
        Assert.Contains(FindingList.Of(lost), f => f.Id == "advice.no_error" && f.Sentence.Contains("no standard error", StringComparison.Ordinal));
        Assert.Equal("some_clusters", lost.Recommendations[1].Rule);
    }

    [Fact]
    public void Where_no_standard_error_exists_the_reason_is_given_and_no_figure()
    {
        var stages = HandMadeStages.Many;
        var none = stages.Inference.Parameters[0] with
        {
            ByKind = stages.Inference.Parameters[0].ByKind.ToImmutableDictionary(k => k.Key, _ => new KindFigures(null, null, null, "It is not identified.")),
        };
        var recommended = (stages with { Inference = stages.Inference with { Parameters = stages.Inference.Parameters.SetItem(0, none) } }).Recommendations[0];
        Assert.Equal(("none", "It is not identified."), (recommended.Rule, recommended.Why));
        Assert.Null(recommended.Kind);
        Assert.Null(recommended.Interval);
    }

    private static ParameterInference TwoWay(ParameterInference parameter, double times)
    {
        var jackknife = parameter.ByKind[CovarianceKind.Jackknife];
        var middle = 0.5 * (jackknife.Interval!.Low + jackknife.Interval.High);
        var half = times * 0.5 * (jackknife.Interval.High - jackknife.Interval.Low);
        return parameter with
        {
            ByKind = parameter.ByKind.SetItem(
                CovarianceKind.TwoWay, new KindFigures(times * jackknife.StandardError, new Interval(middle - half, middle + half), 0.5, null)),
        };
    }
}
