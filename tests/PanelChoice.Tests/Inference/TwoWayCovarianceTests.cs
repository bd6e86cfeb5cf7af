using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Likelihood;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

public class TwoWayCovarianceTests
{
    private const double Identity = 1e-12;

    public static TheoryData<string, bool> Panels => new()
    {
        { "person", false }, { "person", true }, { "household", false }, { "household", true },
    };

    [Theory]
    [MemberData(nameof(Panels))]
    public void It_is_the_sum_over_every_pair_of_occasions_that_share_a_group_with_each_factor(string by, bool weighted)
    {
        var (model, groupOf, input) = Made(by, weighted);
        var result = StandardErrors.Compute(input, Settings(), WorkContext.Quiet);
        var (design, k) = (model.Design, model.Layout.Count);
        var scores = Matrix<double>.Build.DenseOfRowMajor(design.Situations, k, model.Likelihood.Scores(model.Parameters.AsSpan()));
        var cluster = Enumerable.Range(0, design.Situations).Select(s => (long)design.ClusterOf[design.PersonOf[s]]).ToArray();
        var second = Enumerable.Range(0, design.Situations).Select(groupOf).ToArray();
        var bread = Matrix<double>.Build.DenseOfRowMajor(k, k, input.Information.ToArray()).Inverse();
        Matrix<double> Component(Func<int, int, bool> share, int groups)
        {
            var meat = Matrix<double>.Build.Dense(k, k);
            for (var a = 0; a < design.Situations; a++)
                for (var b = 0; b < design.Situations; b++)
                    if (share(a, b)) meat += design.PersonWeight[design.PersonOf[a]] * design.PersonWeight[design.PersonOf[b]] * scores.Row(a).OuterProduct(scores.Row(b));
            return groups / (groups - 1.0) * bread * meat * bread;
        }

        var pairs = cluster.Zip(second).Distinct().Count();
        var expected = Component((a, b) => cluster[a] == cluster[b], cluster.Distinct().Count())
            + Component((a, b) => second[a] == second[b], second.Distinct().Count())
            - Component((a, b) => cluster[a] == cluster[b] && second[a] == second[b], pairs);
        Assert.Equal((cluster.Distinct().Count(), second.Distinct().Count(), pairs), (result.TwoWay!.Clusters, result.TwoWay.SecondClusters, result.TwoWay.Pairs));
        Assert.Equal(Math.Min(result.TwoWay.Clusters, result.TwoWay.SecondClusters) - 1, result.Covariances[CovarianceKind.TwoWay].DegreesOfFreedom);
        for (var p = 0; p < k; p++)
            Assert.InRange(result.Covariances[CovarianceKind.TwoWay].VarianceOf(p) / expected[p, p], 1 - 1e-9, 1 + 1e-9);
    }

    [Fact]
    public void Where_each_pair_is_one_occasion_the_pair_is_the_robust_matrix_with_its_factor()
    {
        var made = Small(61, 30, 8);
        var design = made.Design();
        var (model, _) = NewtonRefitter.Fit(design, design.PlainStart());
        var scores = ScoreSums.Of(model);
        var sums = new ScoreGroups(model, s => made.Panel.Occasion[s]).Sums(1, scores.OuterProduct);
        Assert.Equal((design.Situations, 8), (sums.Pairs, sums.Groups));
        Assert.Equal(scores.OuterProduct, sums.ByPair);
    }

    [Theory]
    [InlineData("scalar")]
    [InlineData("vector")]
    public void Neither_threads_nor_a_kernel_change_the_sums_and_small_windows_change_only_the_order_of_adding(string kernel)
    {
        var made = Small(62, 60, 9).Weighted(p => 1 + (0.3 * (p % 3))).Clustered("household", p => p * 7 % 23);
        var design = made.Design();
        var (fit, _) = NewtonRefitter.Fit(design, design.PlainStart());
        var products = ScoreSums.Of(fit).OuterProduct;
        long GroupOf(int s) => s % 5;
        var expected = new ScoreGroups(fit, GroupOf).Sums(1, products);
        foreach (var window in new[] { ScoreGroups.WindowEntries, 200, 1 })
        {
            var sums = new[] { 1, 2, 5 }.Select(t =>
                new ScoreGroups(fit with { Likelihood = Kernels.Create(kernel, design, NestedLogitForm.UtilityScaled, t) }, GroupOf, window).Sums(t, products)).ToList();
            Assert.All(sums, s => Assert.Equal(sums[0].ByGroup.AsEnumerable(), s.ByGroup));
            Assert.All(sums, s => Assert.Equal(sums[0].ByPair.AsEnumerable(), s.ByPair));
            Assert.Equal((expected.Groups, expected.Pairs), (sums[0].Groups, sums[0].Pairs));
            Assert.InRange(Kernels.Distance(expected.ByGroup, sums[0].ByGroup), 0, 1e-9);
            Assert.InRange(Kernels.Distance(expected.ByPair, sums[0].ByPair), 0, 1e-10);
        }
    }

    [Fact]
    public void Groups_that_are_the_clusters_again_give_the_clustered_figure_and_singletons_too()
    {
        var (_, _, input) = Made("person", weighted: true);
        var (model, design) = (Made("person", weighted: true).Model, Made("person", weighted: true).Model.Design);
        var cluster = StandardErrors.Compute(input, Settings(), WorkContext.Quiet).Covariances[CovarianceKind.Cluster];
        foreach (var groupOf in new Func<int, long>[] { s => 3 * design.PersonOf[s], s => -s })
        {
            var twoWay = StandardErrors.Compute(
                input with { Second = new SecondClusters("x", null, new ScoreGroups(model, groupOf).Sums) }, Settings(), WorkContext.Quiet).Covariances[CovarianceKind.TwoWay];
            for (var p = 0; p < input.Free.Length; p++) Assert.InRange(twoWay.VarianceOf(p) / cluster.VarianceOf(p), 1 - 1e-9, 1 + 1e-9);
        }
    }

    [Fact]
    public void Weights_of_another_unit_change_nothing()
    {
        var (one, seven) = (Made("person", weighted: true).Input, Made("person", weighted: true, unit: 7).Input);
        var (a, b) = (StandardErrors.Compute(one, Settings(), WorkContext.Quiet), StandardErrors.Compute(seven, Settings(), WorkContext.Quiet));
        for (var p = 0; p < one.Free.Length; p++)
            Assert.InRange(a.Covariances[CovarianceKind.TwoWay].VarianceOf(p) / b.Covariances[CovarianceKind.TwoWay].VarianceOf(p), 1 - 1e-7, 1 + 1e-7);
    }

    [Fact]
    public void A_matrix_that_is_not_positive_is_repaired_and_flagged_and_the_variances_are_from_before()
    {
        var toy = new LinearToy(63, 12, _ => 4).Input();
        var scores = toy.Scores(1);
        var f = toy.Free.Length;
        // By the second grouping hardly any scores, by pairs all of them: the first term's variance turns negative, the second's does not.
        double[] little = [.. Enumerable.Range(0, f * f).Select(i => i % (f + 1) == 0 && i > 0 ? scores.OuterProduct[i] : 0)];
        double[] much = [.. Enumerable.Range(0, f * f).Select(i => i == 0 ? 100 * scores.OuterProduct[0] : 0.0)];
        var input = toy with { Second = new SecondClusters("day", null, (_, _) => new SecondSums(4, 40, [.. little], [.. much])) };
        var result = StandardErrors.Compute(input, Settings(), WorkContext.Quiet);
        var estimate = result.Covariances[CovarianceKind.TwoWay];
        Assert.True(result.TwoWay!.Repaired);
        Assert.Contains(0, result.TwoWay.Negative);
        Assert.Contains(0, result.TwoWay.Touched);
        Assert.Equal(result.TwoWay.Negative.AsEnumerable(), estimate.RefusedParameters);
        var refused = result.Parameters[0].ByKind[CovarianceKind.TwoWay];
        Assert.Equal((null, null, null), (refused.StandardError, refused.Interval, refused.PValue));
        Assert.Contains("negative before any repair", refused.Reason!, StringComparison.Ordinal);
        Assert.Contains(estimate.Cautions, c => c.Contains("set to 0", StringComparison.Ordinal) && c.Contains("'x0'", StringComparison.Ordinal));
        foreach (var place in Enumerable.Range(0, f).Except(result.TwoWay.Negative))
            Assert.Equal(Math.Sqrt(estimate.Variances[place]), result.Parameters[place].ByKind[CovarianceKind.TwoWay].StandardError!.Value, Identity);
        var kept = Enumerable.Range(0, f).Except(result.TwoWay.Negative).ToList();
        var matrix = Matrix<double>.Build.Dense(kept.Count, kept.Count, (r, c) => estimate.Matrix![kept[r], kept[c]]);
        Assert.True(matrix.Evd(Symmetricity.Symmetric).EigenValues.Real().Minimum() > -Identity);
    }

    [Fact]
    public void What_cannot_be_said_is_refused_with_its_reason()
    {
        var toy = new LinearToy(64, 12, _ => 4).Input();
        string? Refusal(InferenceInput input) => StandardErrors.Compute(input, Settings(), WorkContext.Quiet).Covariances[CovarianceKind.TwoWay].Refusal;
        Assert.Contains("no second cluster", Refusal(toy), StringComparison.Ordinal);
        Assert.Contains("calendar", Refusal(toy with { Second = new SecondClusters("occasion", "no common calendar", (_, _) => null!) }), StringComparison.Ordinal);
        Assert.Contains("share one day", Refusal(toy with { Second = new SecondClusters("day", null, (_, p) => new SecondSums(1, 12, p, p)) }), StringComparison.Ordinal);
    }

    private static (FittedModel Model, Func<int, long> GroupOf, InferenceInput Input) Made(string by, bool weighted, double unit = 1)
    {
        var made = Small(60, 26, 7);
        if (weighted) made = made.Weighted(p => unit * (1 + (0.4 * (p % 4))));
        // Households whose members do not stand side by side, and groups of which a person has several occasions.
        if (by == "household") made = made.Clustered("household", p => p * 5 % 13);
        var design = made.Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        Func<int, long> groupOf = s => made.Panel.Occasion[s] % 3;
        return (model, groupOf, InferenceInput.From(model, refitter) with { Second = new SecondClusters("third", null, new ScoreGroups(model, groupOf).Sums) });
    }
}
