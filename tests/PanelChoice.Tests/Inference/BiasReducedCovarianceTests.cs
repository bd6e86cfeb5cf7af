using FsCheck.Xunit;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

public class BiasReducedCovarianceTests
{
    private const double ClosedForm = 1e-10;

    [Theory]
    [InlineData(71, 9)]
    [InlineData(72, 30)]
    public void In_a_linear_probability_model_it_and_its_degrees_of_freedom_are_the_hat_matrix_form(int seed, int clusters)
    {
        // Bell and McCaffrey (2002): X_g'(I - P_gg)^(-1/2) e_g; degrees of freedom from the N x G matrix of (I - P)_g' (I - P_gg)^(-1/2) X_g H^-1 c.
        var toy = new LinearToy(seed, clusters, g => 2 + (g * g % 7), columns: 4);
        for (var i = 0; i < toy.Y.Count; i++) toy.Y[i] = toy.Y[i] > 1 ? 1 : 0;
        var estimate = StandardErrors.Compute(toy.Input(), Settings(), WorkContext.Quiet).Covariances[CovarianceKind.BiasReduced];
        var (n, f) = (toy.Y.Count, toy.X.ColumnCount);
        var bread = (toy.X.Transpose() * toy.X).Inverse();
        var residuals = toy.Y - (toy.X * toy.Estimate(_ => 1));
        var annihilator = Matrix<double>.Build.DenseIdentity(n) - (toy.X * bread * toy.X.Transpose());
        var meat = Matrix<double>.Build.Dense(f, f);
        var directions = Enumerable.Range(0, f).Select(_ => Matrix<double>.Build.Dense(n, clusters)).ToArray();
        for (var g = 0; g < clusters; g++)
        {
            var first = toy.ClusterOf.IndexOf(g);
            var size = toy.ClusterOf.Count(c => c == g);
            var x = toy.Rows(g);
            var own = (Matrix<double>.Build.DenseIdentity(size) - (x * bread * x.Transpose())).Evd(Symmetricity.Symmetric);
            var root = own.EigenVectors * Matrix<double>.Build.DenseOfDiagonalVector(own.EigenValues.Real().Map(v => 1 / Math.Sqrt(v))) * own.EigenVectors.Transpose();
            var score = x.Transpose() * root * residuals.SubVector(first, size);
            meat += score.OuterProduct(score);
            for (var k = 0; k < f; k++)
                directions[k].SetColumn(g, annihilator.SubMatrix(0, n, first, size) * root * x * bread.Column(k));
        }

        var expected = bread * meat * bread;
        for (var k = 0; k < f; k++)
        {
            var p = directions[k].Transpose() * directions[k];
            Assert.InRange(estimate.DegreesByTerm[k] / (p.Trace() * p.Trace() / (p * p).Trace()), 1 - ClosedForm, 1 + ClosedForm);
            for (var c = 0; c < f; c++)
                Assert.InRange(Math.Abs(estimate.Matrix![k, c] - expected[k, c]), 0, ClosedForm * Math.Sqrt(expected[k, k] * expected[c, c]));
        }

        Assert.Equal(estimate.DegreesByTerm.Min(), estimate.DegreesOfFreedom);
    }

    [Theory]
    [InlineData(false)]
    [InlineData(true)]
    public void In_a_nested_logit_it_is_the_form_with_pairs_of_clusters_written_out(bool weighted)
    {
        var made = Small(73, 24, 9);
        if (weighted) made = made.Weighted(p => 1 + (0.5 * (p % 3)));
        var design = made.Clustered("household", p => p * 5 % 12).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var input = InferenceInput.From(model, refitter);
        var result = StandardErrors.Compute(input, Settings(), WorkContext.Quiet);
        var estimate = result.Covariances[CovarianceKind.BiasReduced];
        Assert.True(estimate.Matrix is not null, estimate.Refusal);
        var (f, clusters) = (input.Free.Length, 12);
        var h = Matrix<double>.Build.DenseOfRowMajor(f, f, input.Information.ToArray());
        var bread = h.Inverse();
        var parts = Enumerable.Range(0, clusters).Select(g => Matrix<double>.Build.DenseOfRowMajor(f, f, input.ClusterInformation(g, 1).ToArray())).ToArray();
        var sums = ScoreSums.Of(model).ByCluster;
        // The symmetric root of H in the place of the triangular one: the principal root of I - H_g H^-1 is the same.
        var spectrum = h.Evd(Symmetricity.Symmetric);
        Matrix<double> Root(double power) =>
            spectrum.EigenVectors * Matrix<double>.Build.DenseOfDiagonalVector(spectrum.EigenValues.Real().Map(v => Math.Pow(v, power))) * spectrum.EigenVectors.Transpose();
        var adjust = parts.Select(part =>
        {
            var own = (Matrix<double>.Build.DenseIdentity(f) - (Root(-0.5) * part * Root(-0.5))).Evd(Symmetricity.Symmetric);
            return Root(0.5) * own.EigenVectors * Matrix<double>.Build.DenseOfDiagonalVector(own.EigenValues.Real().Map(v => 1 / Math.Sqrt(v))) * own.EigenVectors.Transpose() * Root(-0.5);
        }).ToArray();
        var meat = Matrix<double>.Build.Dense(f, f);
        for (var g = 0; g < clusters; g++)
        {
            var score = adjust[g] * Vector<double>.Build.DenseOfEnumerable(sums.Skip(g * f).Take(f));
            meat += score.OuterProduct(score);
        }

        var expected = bread * meat * bread;
        for (var k = 0; k < f; k++)
        {
            var p = Matrix<double>.Build.Dense(clusters, clusters, (g, other) =>
            {
                var inner = (g == other ? parts[g] : 0 * parts[g]) - (parts[g] * bread * parts[other]);
                return bread.Row(k) * adjust[g] * inner * adjust[other].Transpose() * bread.Column(k);
            });
            Assert.InRange(estimate.DegreesByTerm[k] / (p.Trace() * p.Trace() / (p * p).Trace()), 1 - 1e-8, 1 + 1e-8);
            Assert.InRange(estimate.Matrix![k, k] / expected[k, k], 1 - 1e-9, 1 + 1e-9);
            Assert.Equal(estimate.DegreesByTerm[k], result.Parameters[k].ByKind[CovarianceKind.BiasReduced].DegreesOfFreedom);
            var shares = parts.Select(part => bread.Row(k) * part * bread.Column(k) / bread[k, k]).ToArray();
            var gamma = shares.Average(s => ((s * clusters) - 1) * ((s * clusters) - 1));
            Assert.InRange(result.Parameters[k].Leverage!.Effective / (clusters / (1 + gamma)), 1 - 1e-9, 1 + 1e-9);
            Assert.InRange(result.Parameters[k].Leverage!.Largest / shares.Max(), 1 - 1e-9, 1 + 1e-9);
            Assert.Equal(MathNet.Numerics.Statistics.ArrayStatistics.StandardDeviation(shares) * clusters, result.Parameters[k].Leverage!.Spread, 1e-9);
        }

        var leverages = parts.Select(part => (part * bread).Trace()).ToArray();
        Assert.Equal(f, leverages.Sum(), 1e-9);
        Assert.Equal(leverages.Max(), result.Clusters.LargestLeverage!.Value, 1e-9);
        Assert.Equal(result.Parameters.Min(p => input.Kinds[p.Parameter] == PanelChoice.Design.ParameterKind.Coefficient ? p.Leverage!.Effective : 99), result.Clusters.Effective);
    }

    [Fact]
    public void The_mean_of_equal_clusters_rests_on_all_of_them_with_one_degree_of_freedom_less()
    {
        var toy = new LinearToy(74, 11, _ => 5, columns: 1);
        var result = StandardErrors.Compute(toy.Input(), Settings(), WorkContext.Quiet);
        var estimate = result.Covariances[CovarianceKind.BiasReduced];
        Assert.Equal(10, estimate.DegreesByTerm[0], 1e-9);
        // For a mean of equal clusters the adjusted and the clustered variance with G/(G-1) are the same.
        Assert.Equal(result.Covariances[CovarianceKind.Cluster].Matrix![0, 0], estimate.Matrix![0, 0], 1e-12);
        Assert.Equal(11, result.Parameters[0].Leverage!.Effective, 1e-9);
        Assert.Equal(0, result.Clusters.SizeSpread);
    }

    [Fact]
    public void A_term_that_one_cluster_alone_carries_refuses_it_and_names_the_cluster()
    {
        var toy = new LinearToy(75, 12, _ => 4);
        for (var i = 0; i < toy.Y.Count; i++) toy.X[i, 1] = toy.ClusterOf[i] == 6 ? 1 : 0;
        var result = StandardErrors.Compute(toy.Input(), Settings(), WorkContext.Quiet);
        var refusal = result.Covariances[CovarianceKind.BiasReduced].Refusal!;
        Assert.Contains("Without person 7 ", refusal, StringComparison.Ordinal);
        Assert.Contains("'x1'", refusal, StringComparison.Ordinal);
        Assert.InRange(result.Parameters[1].Leverage!.Effective, 1, 2);
        Assert.InRange(result.Parameters[1].Leverage!.Largest, 0.7, 1);
    }

    [Property(MaxTest = 12)]
    public bool Neither_threads_nor_the_unit_of_weights_nor_of_a_column_change_what_it_says(int seed, byte scale)
    {
        var toy = new LinearToy(seed, 8 + (scale % 9), g => 3 + (g % 4)).Input();
        var factor = 1 + (scale / 10.0);
        // Weights of another unit multiply the scores and the information alike.
        var scaled = toy with
        {
            Information = [.. toy.Information.Select(x => factor * x)],
            ClusterInformation = (first, count) => [.. toy.ClusterInformation(first, count).Select(x => factor * x)],
            Scores = t => new ScoreSums(
                [.. toy.Scores(t).OuterProduct.Select(x => factor * factor * x)], [.. toy.Scores(t).ByCluster.Select(x => factor * x)]),
        };
        CovarianceEstimate Of(InferenceInput input, int threads) =>
            StandardErrors.Compute(input, Settings(), new WorkContext(threads, null, CancellationToken.None)).Covariances[CovarianceKind.BiasReduced];
        var (one, three, other) = (Of(toy, 1), Of(toy, 3), Of(scaled, 1));
        return one.DegreesByTerm.SequenceEqual(three.DegreesByTerm) && one.Matrix!.Equals(three.Matrix)
            && Enumerable.Range(0, 3).All(k => Math.Abs((other.DegreesByTerm[k] / one.DegreesByTerm[k]) - 1) < 1e-9 && Math.Abs((other.Matrix![k, k] / one.Matrix[k, k]) - 1) < 1e-9);
    }

    [Fact]
    public void Influence_is_that_of_refits_or_of_one_step_and_says_which()
    {
        var toy = new LinearToy(76, 45, g => 2 + (g % 3));
        var refit = StandardErrors.Compute(toy.Input(), Settings(JackknifeKind.Refit), WorkContext.Quiet);
        var off = StandardErrors.Compute(toy.Input(), Settings(JackknifeKind.Off), WorkContext.Quiet);
        Assert.Equal((JackknifeKind.Refit, JackknifeKind.OneStep), (refit.Clusters.InfluenceFrom!.Value, off.Clusters.InfluenceFrom!.Value));
        for (var k = 0; k < 3; k++)
        {
            // In a linear model one step is the refit.
            Assert.Equal(refit.Parameters[k].MostInfluential!.Cluster, off.Parameters[k].MostInfluential!.Cluster);
            Assert.Equal(refit.Parameters[k].MostInfluential!.Change, off.Parameters[k].MostInfluential!.Change, 1e-10);
            Assert.Equal(
                Enumerable.Range(0, 45).Max(g => Math.Abs(refit.Jackknife!.Deviations[(g * 3) + k])), Math.Abs(refit.Parameters[k].MostInfluential!.Change));
        }

        Assert.Equal(10, off.Clusters.MostInfluential.Length);
        Assert.Null(off.Jackknife);
    }
}
