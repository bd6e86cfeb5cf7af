using PanelChoice.Inference;
using PanelChoice.Tests.Estimation;
using Xunit;

namespace PanelChoice.Tests.Inference;

public class TermTestTests
{
    private const double SameMethod = 1e-8;

    private static readonly Lazy<TestedModel> Thirty = new(() => TestedModel.Of(5, 30, 8));

    public static TheoryData<string> Labels => ["attribute 1", "same as last time", "land", "constant: B"];

    [Theory]
    [MemberData(nameof(Labels))]
    public void A_test_of_one_parameter_has_the_p_values_that_stand_beside_its_estimate(string label)
    {
        var model = Thirty.Value;
        var result = model.Run(TestedModel.Test("one", [label]));
        var parameter = result.Test.Terms[0].Parameter;
        var beside = model.Errors.Parameters.First(p => p.Parameter == parameter);
        foreach (var kind in new[] { CovarianceKind.Pooled, CovarianceKind.Robust, CovarianceKind.Cluster, CovarianceKind.Jackknife, CovarianceKind.BiasReduced })
            Assert.Equal(beside.ByKind[kind].PValue!.Value, result.Wald[kind].PValue!.Value, SameMethod);
        Assert.Null(result.Wald[CovarianceKind.Robust].DenominatorFreedom);
        Assert.Equal(29, result.Wald[CovarianceKind.Cluster].DenominatorFreedom);
        Assert.NotNull(result.Wald[CovarianceKind.Bootstrap].Reason);
    }

    [Fact]
    public void A_joint_test_is_the_quadratic_form_of_its_covariance()
    {
        var model = Thirty.Value;
        var result = model.Run(TestedModel.Test("both", ["attribute 1", "attribute 2"], [-0.4, 0.3]));
        int[] k = [model.ParameterOf("attribute 1"), model.ParameterOf("attribute 2")];
        var v = model.Errors.Covariances[CovarianceKind.Cluster].Matrix!;
        double[] d = [model.Model.Parameters[k[0]] + 0.4, model.Model.Parameters[k[1]] - 0.3];
        var (a, b, c) = (v[k[0], k[0]], v[k[0], k[1]], v[k[1], k[1]]);
        var w = ((c * d[0] * d[0]) - (2 * b * d[0] * d[1]) + (a * d[1] * d[1])) / ((a * c) - (b * b));
        Assert.Equal(w / 2, result.Wald[CovarianceKind.Cluster].Statistic!.Value, SameMethod);
        Assert.Equal(
            1 - MathNet.Numerics.Distributions.FisherSnedecor.CDF(2, 29, w / 2), result.Wald[CovarianceKind.Cluster].PValue!.Value, SameMethod);
        Assert.Equal((2, 29.0), (result.Wald[CovarianceKind.Cluster].Freedom, result.Wald[CovarianceKind.Cluster].DenominatorFreedom!.Value));
    }

    [Fact]
    public void The_likelihood_ratio_is_that_of_a_fit_with_the_values_fixed()
    {
        var model = Thirty.Value;
        var result = model.Run(TestedModel.Test("held", ["attribute 2", "same as last time"], [0.3, 0.5]));
        var at = model.Made.Covariates.Covariates.Select((c, i) => (c, i)).ToDictionary(x => x.c.Label, x => x.i);
        var held = Fits.Change(
            Fits.Change(model.Made, at["attribute 2"], c => c with { Fixed = 0.3 }), at["same as last time"], c => c with { Fixed = 0.5 });
        var restricted = Fits.Fit(held);
        Assert.Equal(2 * (model.Model.LogLikelihood - restricted.LogLikelihood), result.LikelihoodRatio.Statistic!.Value, SameMethod);
        Assert.Equal(2, result.LikelihoodRatio.Freedom);
        Assert.Contains("independent", result.LikelihoodRatio.Note, StringComparison.Ordinal);
    }

    [Fact]
    public void Equal_dissimilarities_are_one_shared_by_both_nests()
    {
        var model = Thirty.Value;
        var result = model.Run(TestedModel.Test("same nests", ["land", "water"], equal: true));
        var shared = Fits.Fit(model.Made with
        {
            Nests = [model.Made.Nests[0], model.Made.Nests[1] with { SameAs = "land" }],
            Tree = PanelChoice.Tests.Support.SyntheticPanel.TreeOf(
                model.Made.Tree.Alternatives, [model.Made.Nests[0], model.Made.Nests[1] with { SameAs = "land" }]),
        });
        Assert.Equal(2 * (model.Model.LogLikelihood - shared.LogLikelihood), result.LikelihoodRatio.Statistic!.Value, SameMethod);
        Assert.Null(result.Test.Null);
    }

    [Fact]
    public void At_a_restricted_maximum_the_scores_lie_in_the_span_of_the_restrictions()
    {
        var model = Thirty.Value;
        var test = model.Plan(TestedModel.Test("equal", ["constant: B", "constant: C", "attribute 2"], equal: true))[^1];
        var fit = model.Refitter.Fit(test.Restriction);
        Assert.Null(fit.Failure);
        var at = model.Refitter.At(fit.Parameters.AsSpan());
        var f = model.Input.Free.Length;
        var sum = Enumerable.Range(0, f).Select(c => Enumerable.Range(0, model.Input.Clusters.Length).Sum(g => at.ByCluster[(g * f) + c])).ToArray();
        int[] tested = [.. test.Terms.Select(t => model.Input.Free.IndexOf(t.Parameter))];
        Assert.All(Enumerable.Range(0, f).Except(tested), c => Assert.Equal(0, sum[c], 1e-6));
        Assert.Equal(0, tested.Sum(c => sum[c]), 1e-6);
        Assert.Equal(fit.Parameters[test.Terms[0].Parameter], fit.Parameters[test.Terms[2].Parameter], 1e-12);
        Assert.True(Math.Abs(sum[tested[0]]) > 0.01);
    }

    [Fact]
    public void More_restrictions_than_clusters_less_one_are_refused_by_number()
    {
        var model = TestedModel.Of(9, 4, 60);
        var result = model.Run(TestedModel.Test("all", ["constant", "attribute 1", "attribute 2"]));
        Assert.Equal(5, result.Wald[CovarianceKind.Cluster].Freedom);
        Assert.Contains("5 restrictions are more than the 3", result.Wald[CovarianceKind.Cluster].Reason, StringComparison.Ordinal);
        Assert.NotNull(result.Wald[CovarianceKind.Robust].PValue);
    }

    [Fact]
    public void A_term_with_each_is_all_its_coefficients_and_habit_is_tested_by_default()
    {
        var plan = Thirty.Value.Plan(TestedModel.Test("constants", ["constant"]), TestedModel.Test("one", ["constant: C", "land"]));
        Assert.Equal(["habit: same as last time", "all nests at their limits", "constants", "one"], plan.Select(t => t.Name));
        Assert.Equal([true, true, false, false], plan.Select(t => t.IsDefault));
        Assert.Equal(["constant [B]", "constant [C]", "constant [D]"], plan[2].Terms.Select(t => t.Label));
        Assert.Equal([0.0, 1.0], plan[3].Null!.Value.AsEnumerable());
    }

    [Fact]
    public void What_only_the_data_can_tell_is_a_problem_with_its_place()
    {
        var problems = Thirty.Value.Problems(
            TestedModel.Test("a", ["constant: Q"]), TestedModel.Test("b", ["constant"], [1, 2]), TestedModel.Test("c", ["constant", "constant: B"]));
        Assert.Equal(["study.unknown_term", "study.test_values", "study.listed_twice"], problems.Select(p => p.Id));
        Assert.Equal([10, 10, 11], problems.Select(p => p.Position!.Value));
        Assert.All(problems, p => Assert.Equal(20, p.Line));
        Assert.Contains("constant [B], constant [C], constant [D]", problems[1].Remedy, StringComparison.Ordinal);
    }
}
