using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

public class AnalyticCovarianceTests
{
    [Theory]
    [InlineData(false)]
    [InlineData(true)]
    public void Every_analytic_covariance_equals_loops_over_situations(bool weighted)
    {
        var made = Small(3, 30, 6);
        if (weighted) made = made.Weighted(p => 0.5 + (0.25 * (p % 5)));
        var design = made.Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var result = StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(), WorkContext.Quiet);

        var k = design.Layout.Count;
        var scores = Matrix<double>.Build.DenseOfRowMajor(design.Situations, k, model.Likelihood.Scores(model.Parameters.AsSpan()));
        var bread = Matrix<double>.Build.DenseOfRowMajor(k, k, model.Hessian).Negate().Inverse();
        var each = Matrix<double>.Build.Dense(k, k);
        var grouped = Matrix<double>.Build.Dense(k, k);
        for (var p = 0; p < design.Persons; p++)
        {
            var sum = Vector<double>.Build.Dense(k);
            for (var s = design.PersonStart[p]; s < design.PersonStart[p + 1]; s++)
            {
                var score = scores.Row(s) * design.PersonWeight[p];
                each += score.OuterProduct(score);
                sum += score;
            }

            grouped += sum.OuterProduct(sum);
        }

        Same(bread, result.Covariances[CovarianceKind.Pooled]);
        Same(each.Inverse(), result.Covariances[CovarianceKind.OuterProduct]);
        Same(bread * each * bread, result.Covariances[CovarianceKind.Robust]);
        Same(bread * grouped * bread, result.Covariances[CovarianceKind.ClusterUncorrected]);
        Same(30.0 / 29 * (bread * grouped * bread), result.Covariances[CovarianceKind.Cluster]);
        Assert.Equal(29, result.Covariances[CovarianceKind.Cluster].DegreesOfFreedom);
        Assert.Null(result.Covariances[CovarianceKind.Robust].DegreesOfFreedom);
    }

    [Fact]
    public void Clusters_of_several_persons_add_their_scores_first()
    {
        var design = Small(4, 24, 5).Clustered("household", p => p / 2).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var result = StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(), WorkContext.Quiet);
        var k = design.Layout.Count;
        var scores = Matrix<double>.Build.DenseOfRowMajor(design.Situations, k, model.Likelihood.Scores(model.Parameters.AsSpan()));
        var bread = Matrix<double>.Build.DenseOfRowMajor(k, k, model.Hessian).Negate().Inverse();
        var meat = Matrix<double>.Build.Dense(k, k);
        for (var g = 0; g < 12; g++)
        {
            var sum = scores.SubMatrix(g * 10, 10, 0, k).ColumnSums();
            meat += sum.OuterProduct(sum);
        }

        Same(12.0 / 11 * (bread * meat * bread), result.Covariances[CovarianceKind.Cluster]);
        Assert.Equal(("household", 12, 10, 10.0, 10, 11), (
            result.Clusters.By, result.Clusters.Count, result.Clusters.Smallest, result.Clusters.Median, result.Clusters.Largest,
            result.Clusters.DegreesOfFreedom));
    }

    [Fact]
    public void With_one_occasion_per_person_robust_equals_clustered_without_the_factor()
    {
        var design = Small(5, 150, 1).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var result = StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(), WorkContext.Quiet);
        Same(result.Covariances[CovarianceKind.Robust].Matrix!, result.Covariances[CovarianceKind.ClusterUncorrected], 1e-12);
        Assert.Contains(result.Covariances[CovarianceKind.Cluster].Cautions, c => c.Contains("one occasion", StringComparison.Ordinal));
    }

    [Fact]
    public void A_linear_model_gives_the_textbook_sandwich()
    {
        var toy = new LinearToy(1, 25, g => 2 + (g % 4));
        var result = StandardErrors.Compute(toy.Input(), Settings(), WorkContext.Quiet);
        var b = toy.Estimate(_ => 1);
        var e = toy.Y - (toy.X * b);
        var bread = (toy.X.Transpose() * toy.X).Inverse();
        Same(bread, result.Covariances[CovarianceKind.Pooled]);
        Same(bread * toy.X.Transpose() * Matrix<double>.Build.DenseOfDiagonalVector(e.PointwisePower(2)) * toy.X * bread, result.Covariances[CovarianceKind.Robust]);
        var meat = Matrix<double>.Build.Dense(3, 3);
        for (var g = 0; g < 25; g++)
        {
            var at = toy.ClusterOf.IndexOf(g);
            var sum = toy.Rows(g).Transpose() * e.SubVector(at, toy.Rows(g).RowCount);
            meat += sum.OuterProduct(sum);
        }

        Same(25.0 / 24 * (bread * meat * bread), result.Covariances[CovarianceKind.Cluster]);
    }

    [Fact]
    public void Information_by_cluster_adds_up_to_the_whole()
    {
        var design = Small(6, 20, 4).Weighted(p => 1 + (p % 3)).Clustered("household", p => p % 7).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var input = InferenceInput.From(model, refitter);
        var f = input.Free.Length;
        var parts = input.ClusterInformation(0, 7);
        for (var i = 0; i < f * f; i++)
        {
            var sum = Enumerable.Range(0, 7).Sum(g => parts[(g * f * f) + i]);
            Assert.InRange(Math.Abs(sum - input.Information[i]), 0, 1e-10 * Math.Max(1, Math.Abs(sum)));
        }

        Assert.Equal(parts.AsEnumerable(), [.. input.ClusterInformation(0, 3), .. input.ClusterInformation(3, 1), .. input.ClusterInformation(4, 3)]);
    }

    [Fact]
    public void The_unit_of_the_weights_changes_only_what_is_said_to_depend_on_it()
    {
        var made = Small(7, 30, 5).Weighted(p => 0.5 + (0.25 * (p % 4)));
        var one = Compute(made);
        var ten = Compute(made.Weighted(p => 10 * made.Panel.Weight[p]));
        Same(one.Covariances[CovarianceKind.Cluster].Matrix!, ten.Covariances[CovarianceKind.Cluster], 1e-10);
        Same(one.Covariances[CovarianceKind.Robust].Matrix!, ten.Covariances[CovarianceKind.Robust], 1e-10);
        Same(one.Covariances[CovarianceKind.Pooled].Matrix! / 10, ten.Covariances[CovarianceKind.Pooled], 1e-10);
        Same(one.Covariances[CovarianceKind.OuterProduct].Matrix! / 100, ten.Covariances[CovarianceKind.OuterProduct], 1e-10);
        foreach (var (a, b) in one.Parameters.Zip(ten.Parameters))
        {
            Assert.InRange(a.SeRatio!.Value / b.SeRatio!.Value, 1 - 1e-10, 1 + 1e-10);
            Assert.Contains("mean 1", a.RatioLabel, StringComparison.Ordinal);
            foreach (var kind in new[] { CovarianceKind.Pooled, CovarianceKind.OuterProduct })
            {
                Assert.NotNull(a.ByKind[kind].StandardError);
                Assert.Null(a.ByKind[kind].Interval);
                Assert.Null(a.ByKind[kind].PValue);
                Assert.Contains("unit of the sampling weights", a.ByKind[kind].Reason, StringComparison.Ordinal);
            }

            Assert.NotNull(a.ByKind[CovarianceKind.Cluster].PValue);
        }

        static InferenceResult Compute(Support.SyntheticPanel made)
        {
            var design = made.Design();
            var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
            return StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(), WorkContext.Quiet);
        }
    }

    [Fact]
    public void A_singular_Hessian_refuses_everything_and_names_the_term()
    {
        var input = new LinearToy(2, 10, _ => 3).Input();
        var information = input.Information.ToArray();
        for (var i = 0; i < 3; i++) information[(2 * 3) + i] = information[3 + i];
        for (var i = 0; i < 3; i++) information[(i * 3) + 2] = information[(i * 3) + 1];
        var result = StandardErrors.Compute(input with { Information = [.. information] }, Settings(JackknifeKind.Refit, 20), WorkContext.Quiet);
        Assert.All(result.Covariances.Values, c => Assert.Null(c.Matrix));
        Assert.All(result.Covariances.Values, c => Assert.Contains("'x2'", c.Refusal, StringComparison.Ordinal));
        Assert.All(result.Parameters, p => Assert.All(p.ByKind.Values, f => Assert.Equal((null, null, null), (f.StandardError, f.Interval, f.PValue))));
        Assert.Null(result.Jackknife);
        Assert.Null(result.Bootstrap);
    }

    [Theory]
    [InlineData(FitStatus.NotIdentified)]
    [InlineData(FitStatus.Separated)]
    [InlineData(FitStatus.Boundary)]
    [InlineData(FitStatus.Stopped)]
    public void Away_from_a_maximum_no_figure_is_given(FitStatus status)
    {
        var design = Small(8, 12, 4).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var result = StandardErrors.Compute(
            InferenceInput.From(model with { Status = status }, refitter), Settings(JackknifeKind.Refit, 20), WorkContext.Quiet);
        Assert.All(result.Covariances.Values, c => Assert.NotNull(c.Refusal));
        Assert.All(result.Parameters, p => Assert.Equal(result.Covariances[CovarianceKind.Cluster].Refusal, p.RatioReason));
        Assert.Equal(12, result.Clusters.Count);
    }

    [Fact]
    public void One_cluster_refuses_what_rests_on_clusters_and_keeps_the_rest()
    {
        var result = StandardErrors.Compute(new LinearToy(3, 1, _ => 30).Input(), Settings(JackknifeKind.Auto, 20), WorkContext.Quiet);
        foreach (var kind in new[] { CovarianceKind.Cluster, CovarianceKind.ClusterUncorrected, CovarianceKind.Jackknife, CovarianceKind.Bootstrap })
            Assert.Contains("one cluster", result.Covariances[kind].Refusal, StringComparison.Ordinal);
        Assert.NotNull(result.Parameters[0].ByKind[CovarianceKind.Robust].PValue);
        Assert.Equal((null, null), (result.Parameters[0].SeRatio, result.Parameters[0].EquivalentOccasions));
        Assert.Contains("one cluster", result.Parameters[0].RatioReason, StringComparison.Ordinal);
        Assert.Equal(0, result.Clusters.DegreesOfFreedom);
    }

    [Fact]
    public void Two_clusters_give_figures_with_one_degree_of_freedom_and_a_caution_about_rank()
    {
        var result = StandardErrors.Compute(new LinearToy(4, 2, _ => 15).Input(), Settings(JackknifeKind.Auto), WorkContext.Quiet);
        var cluster = result.Covariances[CovarianceKind.Cluster];
        Assert.Equal(1, cluster.DegreesOfFreedom);
        Assert.Equal(2, cluster.Factor);
        Assert.Contains(cluster.Cautions, c => c.Contains("rank 1 at most", StringComparison.Ordinal));
        Assert.Contains(cluster.Cautions, c => c.Contains("too small", StringComparison.Ordinal));
        Assert.Equal(0.5, result.Covariances[CovarianceKind.Jackknife].Factor);
    }

    [Fact]
    public void Contributions_that_are_whole_persons_have_no_robust_covariance()
    {
        var result = StandardErrors.Compute(
            new LinearToy(5, 20, _ => 1).Input() with { Contribution = ContributionKind.Person }, Settings(), WorkContext.Quiet);
        Assert.Contains("integrated over each person", result.Covariances[CovarianceKind.Robust].Refusal, StringComparison.Ordinal);
        Assert.NotNull(result.Covariances[CovarianceKind.Cluster].Matrix);
    }

    [Fact]
    public void A_cluster_without_information_counts_and_changes_nothing_but_the_factor()
    {
        var input = new LinearToy(6, 20, _ => 3).Input();
        var more = input with
        {
            Clusters = input.Clusters.Add("21"), ClusterOccasions = input.ClusterOccasions.Add(0),
            Scores = threads => new ScoreSums(input.Scores(threads).OuterProduct, [.. input.Scores(threads).ByCluster, 0, 0, 0]),
            ClusterInformation = (first, count) => [.. input.ClusterInformation(first, Math.Min(20, first + count) - first), .. new double[first + count > 20 ? 9 : 0]],
        };
        var with21 = StandardErrors.Compute(more, Settings(), WorkContext.Quiet).Covariances;
        var with20 = StandardErrors.Compute(input, Settings(), WorkContext.Quiet).Covariances;
        Assert.Equal(with20[CovarianceKind.ClusterUncorrected].Matrix!.ToRowMajorArray(), with21[CovarianceKind.ClusterUncorrected].Matrix!.ToRowMajorArray());
        Assert.Equal(21.0 / 20, with21[CovarianceKind.Cluster].Factor);
    }

    [Fact]
    public void Everything_fixed_is_said_and_lengths_that_do_not_fit_are_a_mistake_of_the_caller()
    {
        var input = new LinearToy(7, 5, _ => 3).Input();
        var none = StandardErrors.Compute(input with { Free = [], Nulls = [], Information = [] }, Settings(), WorkContext.Quiet);
        Assert.All(none.Covariances.Values, c => Assert.Contains("fixed", c.Refusal, StringComparison.Ordinal));
        Assert.Empty(none.Parameters);
        Assert.Throws<ArgumentException>(() => StandardErrors.Compute(input with { Scores = _ => new ScoreSums([], []) }, Settings(), WorkContext.Quiet));
    }

    private static void Same(Matrix<double> expected, CovarianceEstimate actual, double tolerance = 1e-10)
    {
        Assert.Null(actual.Refusal);
        for (var r = 0; r < expected.RowCount; r++)
            for (var c = 0; c < expected.ColumnCount; c++)
            {
                // Two orders of summation differ by rounding times the condition of H; entries are compared in standard errors.
                var unit = Math.Sqrt(expected[r, r] * expected[c, c]);
                Assert.InRange(Math.Abs(expected[r, c] - actual.Matrix![r, c]), 0, tolerance * unit);
                Assert.Equal(actual.Matrix[r, c], actual.Matrix[c, r]);
            }
    }
}
