using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

public class ClusterBootstrapTests
{
    [Fact]
    public void A_draw_has_as_many_clusters_as_the_sample_and_depends_on_seed_and_replicate_alone()
    {
        for (var r = 0; r < 50; r++)
        {
            var weights = ClusterDraw.Weights(7, r, 23);
            Assert.Equal(23, weights.Sum());
            Assert.All(weights, w => Assert.Equal(Math.Floor(w), w));
            Assert.Equal(weights.ToArray(), ClusterDraw.Weights(7, r, 23).ToArray());
            Assert.NotEqual(weights.ToArray(), ClusterDraw.Weights(8, r, 23).ToArray());
            Assert.NotEqual(weights.ToArray(), ClusterDraw.Weights(7, r + 1, 23).ToArray());
        }

        // A cluster is missing from a draw with probability (1 - 1/23)^23 = 0.360; 50 x 23 clusters give a standard error of about 0.01.
        var missing = Enumerable.Range(0, 50).Sum(r => ClusterDraw.Weights(7, r, 23).Count(w => w == 0)) / (50.0 * 23);
        Assert.InRange(missing, 0.32, 0.40);
    }

    [Fact]
    public void Any_number_of_threads_and_any_split_of_the_replicates_give_the_same_bits()
    {
        var design = Small(41, 16, 6).Design();
        var (model, one) = NewtonRefitter.Fit(design, design.PlainStart());
        var (_, two) = NewtonRefitter.Fit(design, design.PlainStart(), threads: 2);
        var a = StandardErrors.Compute(InferenceInput.From(model, one), Settings(JackknifeKind.Refit, 24), WorkContext.Quiet);
        var b = StandardErrors.Compute(InferenceInput.From(model, two), Settings(JackknifeKind.Refit, 24), new WorkContext(2, null, CancellationToken.None));
        Assert.InRange(a.Bootstrap!.Done, 20, 24);
        Assert.Equal(a.Bootstrap.Estimates.ToArray(), b.Bootstrap!.Estimates.ToArray());
        Assert.Equal(a.Jackknife!.Deviations.ToArray(), b.Jackknife!.Deviations.ToArray());
        foreach (var kind in a.Covariances.Keys)
            Assert.Equal(a.Covariances[kind].Matrix?.ToRowMajorArray(), b.Covariances[kind].Matrix?.ToRowMajorArray());
        Assert.Equal(a.Parameters.Select(p => p.BootstrapPercentile), b.Parameters.Select(p => p.BootstrapPercentile));

        var input = InferenceInput.From(model, one);
        var halves = ClusterBootstrap.Replicates(input, Settings(replicates: 24), 0, 13, WorkContext.Quiet)
            .AddRange(ClusterBootstrap.Replicates(input, Settings(replicates: 24), 13, 11, WorkContext.Quiet));
        Assert.Equal(a.Bootstrap.Estimates.ToArray(), ClusterBootstrap.Summarise(input, Settings(replicates: 24), halves).Estimates.ToArray());
    }

    [Fact]
    public void Integer_weights_equal_a_panel_of_cloned_persons()
    {
        var made = Small(42, 18, 6);
        var design = made.Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var result = StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(replicates: 3), WorkContext.Quiet);
        for (var r = 0; r < 3; r++)
        {
            var weights = ClusterDraw.Weights(7, r, 18);
            var clones = made.Pick([.. Enumerable.Range(0, 18).SelectMany(p => Enumerable.Repeat(p, (int)weights[p]))]).Design();
            var (fresh, _) = NewtonRefitter.Fit(clones, clones.PlainStart());
            for (var k = 0; k < design.Layout.Count; k++)
                Assert.InRange(Math.Abs(result.Bootstrap!.Estimates[(r * design.Layout.Count) + k] - fresh.Parameters[k]), 0, 1e-8);
            Assert.InRange(Math.Abs(result.Bootstrap!.LogLikelihood[r] - fresh.LogLikelihood), 0, 1e-8);
        }
    }

    [Fact]
    public void The_covariance_is_that_of_the_replicates_around_their_mean()
    {
        var input = new LinearToy(43, 20, _ => 4).Input();
        var result = StandardErrors.Compute(input, Settings(replicates: 60), WorkContext.Quiet);
        var rows = Matrix<double>.Build.DenseOfRowMajor(60, 3, result.Bootstrap!.Estimates);
        for (var r = 0; r < 3; r++)
            for (var c = 0; c < 3; c++)
            {
                var (a, b) = (rows.Column(r), rows.Column(c));
                var expected = (a - (a.Sum() / 60)).DotProduct(b - (b.Sum() / 60)) / 59;
                Assert.InRange(Math.Abs(result.Covariances[CovarianceKind.Bootstrap].Matrix![r, c] - expected), 0, 1e-12);
            }

        var figures = result.Parameters[1];
        Assert.Equal(figures.ByKind[CovarianceKind.Bootstrap].StandardError / Math.Sqrt(120), figures.BootstrapError);
        Assert.Equal(19, result.Covariances[CovarianceKind.Bootstrap].DegreesOfFreedom);
    }

    [Fact]
    public void For_a_mean_of_equal_clusters_it_estimates_the_uncorrected_clustered_variance()
    {
        // The mean is linear in the integer weights, whose covariance is that of G draws from G: the exact bootstrap variance is the clustered one
        // without its factor.
        var result = StandardErrors.Compute(new LinearToy(44, 25, _ => 4, columns: 1).Input(), Settings(replicates: 3000), WorkContext.Quiet);
        var bootstrap = result.Parameters[0].ByKind[CovarianceKind.Bootstrap].StandardError!.Value;
        var exact = result.Parameters[0].ByKind[CovarianceKind.ClusterUncorrected].StandardError!.Value;
        Assert.InRange(bootstrap - exact, -4 * result.Parameters[0].BootstrapError!.Value, 4 * result.Parameters[0].BootstrapError!.Value);
    }

    [Fact]
    public void Draws_in_which_a_dummy_vanishes_are_counted_by_kind_and_refuse_the_covariance_by_name()
    {
        // Two of twelve persons hold the ticket: neither is drawn with probability (10/12)^12 = 0.112.
        var design = Small(45, 12, 10).WithTicket(2, 3, 8).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var result = StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(replicates: 60), WorkContext.Quiet);
        var without = Enumerable.Range(0, 60).Where(r => ClusterDraw.Weights(7, r, 12) is var w && w[3] == 0 && w[8] == 0).ToList();
        Assert.NotEmpty(without);
        var summary = result.Bootstrap!;
        var lost = summary.Failures.Single(f => f.Kind == "not identified");
        Assert.Equal(without, lost.Replicates.AsEnumerable());
        Assert.Equal(60, summary.Done + summary.Failures.Sum(f => f.Count));
        Assert.Equal(60 - summary.Done, summary.LogLikelihood.Count(double.IsNaN));
        Assert.All(without, r => Assert.Equal("not identified", summary.Status[r]));
        var refusal = result.Covariances[CovarianceKind.Bootstrap].Refusal;
        Assert.StartsWith($"{60 - summary.Done} of 60 replicates failed (", refusal, StringComparison.Ordinal);
        Assert.Contains($"{lost.Count} not identified: 'ticket [C]'", refusal, StringComparison.Ordinal);
        Assert.Contains("more than 5 percent", refusal, StringComparison.Ordinal);
        Assert.All(result.Parameters, p => Assert.Equal((null, null), (p.BootstrapPercentile, p.BootstrapError)));
        Assert.All(result.Parameters, p => Assert.Equal(refusal, p.ByKind[CovarianceKind.Bootstrap].Reason));
        Assert.NotNull(result.Parameters[0].ByKind[CovarianceKind.Cluster].StandardError);
    }

    [Theory]
    [InlineData(5, true)]
    [InlineData(6, false)]
    public void Exactly_five_percent_of_failures_still_give_a_covariance_with_a_caution(int failures, bool given)
    {
        var input = new LinearToy(46, 15, _ => 4).Input();
        var toy = input.Refitter;
        var asked = 0;
        var scripted = new ScriptedRefitter(r => asked++ < failures
            ? ScriptedRefitter.Failed(asked % 2 == 0 ? FitStatus.Separated : FitStatus.Stopped, 1)
            : toy.Refit([r], CancellationToken.None)[0]);
        var result = StandardErrors.Compute(input with { Refitter = scripted }, Settings(replicates: 100), WorkContext.Quiet);
        Assert.Equal((100 - failures, failures), (result.Bootstrap!.Done, result.Bootstrap.Retried));
        Assert.Equal(given, result.Covariances[CovarianceKind.Bootstrap].Matrix is not null);
        Assert.Equal(100, scripted.Asked.Count);
        if (!given) return;
        Assert.Contains(result.Covariances[CovarianceKind.Bootstrap].Cautions, c => c.Contains("3 not converged: 'x1', 2 separated: 'x1'", StringComparison.Ordinal));
        // 5 failures of 100 reach past the 2.5 percent end, so that the percentile interval could end anywhere.
        Assert.Null(result.Parameters[0].BootstrapPercentile);
        Assert.Contains("the end could be anywhere", result.Parameters[0].PercentileReason, StringComparison.Ordinal);
        Assert.Equal(
            result.Parameters[0].ByKind[CovarianceKind.Bootstrap].StandardError!.Value / Math.Sqrt(2 * 95), result.Parameters[0].BootstrapError!.Value, 15);
    }

    [Fact]
    public void A_replicate_that_is_not_finite_is_a_failure_whatever_it_calls_itself()
    {
        var input = new LinearToy(47, 15, _ => 4).Input();
        var scripted = input with { Refitter = new ScriptedRefitter(_ => ScriptedRefitter.Converged(1, double.PositiveInfinity, 1)) };
        var result = StandardErrors.Compute(scripted, Settings(replicates: 10), WorkContext.Quiet);
        Assert.Equal(("not finite", 10), (result.Bootstrap!.Failures.Single().Kind, result.Bootstrap.Failures.Single().Count));
        Assert.NotNull(result.Covariances[CovarianceKind.Bootstrap].Refusal);
    }

    [Fact]
    public void A_spread_that_hangs_on_a_few_replicates_is_said()
    {
        var input = new LinearToy(48, 15, _ => 4).Input();
        var toy = input.Refitter;
        var asked = 0;
        var scripted = new ScriptedRefitter(r => asked++ % 50 == 0
            ? ScriptedRefitter.Converged(input.Estimates[0], 12, input.Estimates[2])
            : toy.Refit([r], CancellationToken.None)[0]);
        var cautions = StandardErrors.Compute(input with { Refitter = scripted }, Settings(replicates: 399), WorkContext.Quiet)
            .Covariances[CovarianceKind.Bootstrap].Cautions;
        Assert.Contains("'x1'", Assert.Single(cautions), StringComparison.Ordinal);
        Assert.DoesNotContain("'x0'", cautions[0], StringComparison.Ordinal);
        var few = StandardErrors.Compute(input, Settings(replicates: 99), WorkContext.Quiet).Covariances[CovarianceKind.Bootstrap].Cautions;
        Assert.Contains("outermost of 99", Assert.Single(few), StringComparison.Ordinal);
    }

    [Fact]
    public void No_replicates_asked_for_is_a_reason_of_its_own()
    {
        var result = StandardErrors.Compute(new LinearToy(49, 15, _ => 4).Input(), Settings(), WorkContext.Quiet);
        Assert.Null(result.Bootstrap);
        Assert.Contains("No bootstrap replicates", result.Parameters[0].PercentileReason, StringComparison.Ordinal);
        Assert.Null(result.Parameters[0].BootstrapError);
    }
}
