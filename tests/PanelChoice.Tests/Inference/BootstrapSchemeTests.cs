using FsCheck.Xunit;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

public class BootstrapSchemeTests
{
    [Fact]
    public void Exponential_weights_are_positive_with_mean_one_and_depend_on_seed_and_replicate_alone()
    {
        for (var r = 0; r < 50; r++)
        {
            var weights = ClusterDraw.Weights(BootstrapDraw.Exponential, 7, r, 23);
            Assert.All(weights, w => Assert.True(w > 0));
            Assert.Equal(23, weights.Sum(), 1e-12 * 23);
            Assert.Equal(weights.ToArray(), ClusterDraw.Weights(BootstrapDraw.Exponential, 7, r, 23).ToArray());
            Assert.NotEqual(weights.ToArray(), ClusterDraw.Weights(BootstrapDraw.Exponential, 8, r, 23).ToArray());
        }

        // Normalised exponentials have variance (G - 1) / (G + 1) = 0.917; 1,150 of them tell it to about 8 percent.
        var all = Enumerable.Range(0, 50).SelectMany(r => ClusterDraw.Weights(BootstrapDraw.Exponential, 7, r, 23)).ToArray();
        Assert.InRange(all.Average(w => (w - 1) * (w - 1)), 0.917 * 0.75, 0.917 * 1.3);
    }

    [Fact]
    public void For_a_mean_of_equal_clusters_corrected_exponential_weights_estimate_the_clustered_variance_with_its_factor()
    {
        // Dirichlet weights give sum (x - mean)^2 / (G (G + 1)); times (G + 1) / (G - 1) it is the clustered variance with G / (G - 1), exactly.
        var result = StandardErrors.Compute(
            new LinearToy(71, 12, _ => 4, columns: 1).Input(), Settings(replicates: 3000) with { Draw = BootstrapDraw.Exponential }, WorkContext.Quiet);
        Assert.Equal(13 / 11.0, result.Covariances[CovarianceKind.Bootstrap].Factor, 1e-15);
        var figures = result.Parameters[0];
        Assert.InRange(
            figures.ByKind[CovarianceKind.Bootstrap].StandardError!.Value - figures.ByKind[CovarianceKind.Cluster].StandardError!.Value,
            -4 * figures.BootstrapErrors!.StandardError!.Value, 4 * figures.BootstrapErrors.StandardError.Value);
    }

    [Fact]
    public void Percentiles_of_exponential_weights_are_as_wide_as_their_covariance_and_finer_intervals_are_refused()
    {
        var input = new LinearToy(72, 12, _ => 4).Input();
        var result = StandardErrors.Compute(input, Settings(JackknifeKind.Refit, 199) with { Draw = BootstrapDraw.Exponential }, WorkContext.Quiet);
        var stretch = Math.Sqrt(13 / 11.0);
        var values = Enumerable.Range(0, 199).Select(r => input.Estimates[1] + (stretch * (result.Bootstrap!.Estimates[(r * 3) + 1] - input.Estimates[1]))).Order().ToArray();
        Assert.Equal(values[4], result.Parameters[1].BootstrapPercentile!.Low, 1e-12);
        Assert.Equal(values[194], result.Parameters[1].BootstrapPercentile!.High, 1e-12);
        Assert.Contains("skewness", result.Parameters[1].AcceleratedReason, StringComparison.Ordinal);
        Assert.NotNull(result.Parameters[1].StudentisedReason);
    }

    [Property(MaxTest = 20)]
    public void Weights_in_fractions_of_counts_are_the_counts(int seed, byte scale)
    {
        // A common factor changes no maximum: fractional weights go the same way as draws.
        var design = Small(73, 12, 5).Design();
        var (model, _) = NewtonRefitter.Fit(design, design.PlainStart());
        var refitter = new ClusterRefitter(model, 1);
        var counts = ClusterDraw.Weights(seed, 0, 12);
        var factor = 0.1 + (scale / 100.0);
        var outcomes = refitter.Refit(
            [new RefitRequest(counts, model.Parameters, []), new RefitRequest([.. counts.Select(w => w * factor)], model.Parameters, [])], CancellationToken.None);
        Assert.Equal(outcomes[0].Status, outcomes[1].Status);
        if (outcomes[0].Status != FitStatus.Converged) return;
        for (var k = 0; k < design.Layout.Count; k++) Assert.Equal(outcomes[0].Parameters[k], outcomes[1].Parameters[k], 1e-6 * Math.Max(1, Math.Abs(outcomes[0].Parameters[k])));
    }

    [Fact]
    public void The_number_of_replicates_follows_the_three_step_rule()
    {
        // Andrews and Buchinsky: 10,000 z^2 w / pdb^2 with w = 1/2 gives 192.07 for 10 percent and 768.3 for 5, rounded up.
        Assert.Equal(193, ReplicateNumber.First(0.10));
        Assert.Equal(769, ReplicateNumber.First(0.05));
        Assert.Equal(769, ReplicateNumber.Needed(0.05, 3));
        // Excess kurtosis 3: w = 5/4.
        Assert.Equal((int)Math.Ceiling(1.959963984540054 * 1.959963984540054 * 1.25 / 0.0025), ReplicateNumber.Needed(0.05, 6));
        Assert.Equal(ReplicateNumber.Most, ReplicateNumber.Needed(0.05, 1000));
        Assert.True(ReplicateNumber.IsOutOfReach(0.05, 1000));
    }

    [Fact]
    public void A_target_finds_a_number_and_leaves_each_replicate_what_it_was()
    {
        var input = new LinearToy(74, 20, _ => 4).Input();
        var found = StandardErrors.Compute(input, Settings() with { Replicates = 399, Target = 0.15 }, WorkContext.Quiet).Bootstrap!;
        var first = StandardErrors.Compute(input, Settings(replicates: ReplicateNumber.First(0.15)), WorkContext.Quiet).Bootstrap!;
        var kurtosis = Enumerable.Range(0, 3).Max(k => MonteCarloErrors.Kurtosis([.. Enumerable.Range(0, first.Requested).Select(r => first.Estimates[(r * 3) + k])]));
        Assert.Equal(Math.Max(first.Requested, ReplicateNumber.Needed(0.15, kurtosis)), found.Requested);
        Assert.Equal(0.15, found.Target);
        Assert.Equal(first.Estimates.ToArray(), found.Estimates[..first.Estimates.Length].ToArray());
    }

    [Fact]
    public void Heavy_tails_ask_for_more_replicates_than_there_are_and_it_is_said()
    {
        var input = new LinearToy(75, 15, _ => 4).Input();
        var scripted = new ScriptedRefitter(r => ScriptedRefitter.Converged(
            input.Estimates[0] + (r.Number % 300 == 0 ? 50 : (r.Number % 7) - 3), input.Estimates[1] + (r.Number % 5), input.Estimates[2] + (r.Number % 3)));
        var result = StandardErrors.Compute(input with { Refitter = scripted }, Settings() with { Replicates = 399, Target = 0.05, Studentised = false }, WorkContext.Quiet);
        Assert.Equal(ReplicateNumber.Most, result.Bootstrap!.Requested);
        Assert.Contains(result.Covariances[CovarianceKind.Bootstrap].Cautions, c => c.Contains("was not reached", StringComparison.Ordinal));
        Assert.Equal(Enumerable.Range(0, ReplicateNumber.Most), scripted.Asked.Select(r => r.Number));
    }

    [Fact]
    public void Failed_replicates_enter_at_their_last_iterate_or_at_the_farthest_that_converged()
    {
        var input = new LinearToy(76, 15, _ => 4, columns: 2).Input();
        RefitOutcome Stopped(params int[] about) => new(FitStatus.Stopped, [10, 20], -1, 7, true, null, [.. about]);
        var outcomes = new[] { (1.0, 0.0), (2, 1), (3, 5), (6, 2) }.Select(x => ScriptedRefitter.Converged(x.Item1, x.Item2)).ToList();
        var never = new RefitOutcome(FitStatus.NotIdentified, [99, 99], -1, 0, false, null, [0]);
        var errors = FailedReplicates.StandardErrors(input, [.. outcomes, Stopped(1), never], 1);
        // First parameter: 10 is a last iterate; the replicate that was never fitted stands at 6, farthest from the mean 3.
        Assert.Equal(MathNet.Numerics.Statistics.ArrayStatistics.StandardDeviation([1.0, 2, 3, 6, 10, 6]), errors[0], 1e-12);
        // Second: it is named by one failure and never fitted by the other; 5 is farthest from the mean 2.
        Assert.Equal(MathNet.Numerics.Statistics.ArrayStatistics.StandardDeviation([0.0, 1, 5, 2, 5, 5]), errors[1], 1e-12);
        Assert.Equal(
            [(4, "not converged"), (5, "not identified")],
            FailedReplicates.List(input, [.. outcomes, Stopped(1), never]).Select(f => (f.Replicate, f.Kind)));
    }

    [Fact]
    public void A_refusal_for_failures_names_the_alternative()
    {
        var input = new LinearToy(77, 15, _ => 4).Input() with { Refitter = new ScriptedRefitter(_ => ScriptedRefitter.Failed(FitStatus.Stopped)) };
        string Refusal(BootstrapDraw draw) =>
            StandardErrors.Compute(input, Settings(replicates: 20) with { Draw = draw }, WorkContext.Quiet).Covariances[CovarianceKind.Bootstrap].Refusal!;
        Assert.Contains("draw = \"exponential\"", Refusal(BootstrapDraw.Counts), StringComparison.Ordinal);
        Assert.DoesNotContain("draw = \"exponential\"", Refusal(BootstrapDraw.Exponential), StringComparison.Ordinal);
        Assert.Contains("jackknife", Refusal(BootstrapDraw.Exponential), StringComparison.Ordinal);
    }

    [Fact]
    public void A_failed_refit_is_tried_again_from_starts_of_its_own_number()
    {
        // The same request under two numbers is the same refit where it settles; where it fails, both are classified alike.
        var design = Small(45, 12, 10).WithTicket(2, 3, 8).Design();
        var (model, _) = NewtonRefitter.Fit(design, design.PlainStart());
        var refitter = new ClusterRefitter(model, 1);
        for (var r = 0; r < 12; r++)
        {
            var weights = ClusterDraw.Weights(7, r, 12);
            var both = refitter.Refit(
                [new RefitRequest(weights, model.Parameters, []) { Number = r }, new RefitRequest(weights, model.Parameters, []) { Number = r + 500 }], CancellationToken.None);
            Assert.Equal(both[0].Status, both[1].Status);
            Assert.Equal(both[0].FailureKind, both[1].FailureKind);
            if (!both[0].Retried) Assert.Equal(both[0].Parameters.ToArray(), both[1].Parameters.ToArray());
        }
    }
}
