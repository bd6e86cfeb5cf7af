using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using Xunit;

namespace PanelChoice.Tests.Estimation;

/// <summary>Refits side by side come to what refits one by one come to, whatever company they are in.</summary>
public class BatchedRefitTests
{
    private static readonly Replicates Small = new(Replicates.Panel(21, 60, 12).Design());

    /// <summary>Long enough for threads to share a pass, and for the tolerance of large samples.</summary>
    private static readonly Lazy<Replicates> Large = new(() => new(Replicates.Panel(22, 1_000, 52).Design()));

    [Fact]
    public void Outcomes_have_the_same_bits_for_any_number_of_threads_and_any_split_of_a_small_sample() => SameBits(Small, 40);

    [Fact]
    public void Outcomes_have_the_same_bits_for_any_number_of_threads_and_any_split_of_a_large_sample()
    {
        Assert.True(Large.Value.Model.Design.Situations >= VectorNestedLogit.SituationsForThreads);
        SameBits(Large.Value, 10);
    }

    [Fact]
    public void On_a_large_sample_every_replicate_is_within_1e_5_standard_errors_of_its_maximum()
    {
        var requests = Large.Value.Draws(12);
        var outcomes = new ClusterRefitter(Large.Value.Model, 2).Refit(requests, CancellationToken.None);
        for (var r = 0; r < requests.Length; r++)
        {
            Assert.Equal(FitStatus.Converged, outcomes[r].Status);
            Assert.InRange(outcomes[r].Decrement, 0, ClusterRefitter.Tolerance);
            Assert.InRange(Large.Value.Distance(requests[r], outcomes[r]), 0, 0.3 * ClusterRefitter.Tolerance);
            Assert.InRange(outcomes[r].Iterations, 2, 5);
            Assert.InRange(Large.Value.Exact(requests[r]).LogLikelihood - outcomes[r].LogLikelihood, -1e-7, 1e-7);
        }
    }

    [Fact]
    public void On_a_small_sample_replicates_agree_with_exact_Newton_steps_to_8_digits()
    {
        var requests = Small.Told(Small.Draws(60).AddRange(Small.Deletions(20)));
        var outcomes = Small.SideBySide(requests, ClusterRefitter.ToleranceOfSmall);
        Assert.InRange(outcomes.Count(o => o is not null), 20, requests.Length);
        for (var r = 0; r < requests.Length; r++)
        {
            if (outcomes[r] is not { } outcome) continue;
            var exact = Small.Exact(requests[r]);
            Assert.Equal(exact.Status, outcome.Status);
            Assert.Equal(exact.LogLikelihood, outcome.LogLikelihood, 9);
            for (var k = 0; k < exact.Parameters.Length; k++) Assert.Equal(exact.Parameters[k], outcome.Parameters[k], 1e-8 * (1 + Math.Abs(exact.Parameters[k])));
        }
    }

    [Fact]
    public void What_does_not_settle_side_by_side_is_what_exact_Newton_steps_make_of_it_to_the_bit()
    {
        var hard = new Replicates(Replicates.Panel(23, 8, 12, 0.3, 0.9).Design());
        var requests = hard.Draws(80);
        var settled = hard.SideBySide(hard.Told(requests), ClusterRefitter.ToleranceOfSmall).Count(o => o is not null);
        Assert.InRange(settled, 1, requests.Length - 1);
        var outcomes = new ClusterRefitter(hard.Model, 2).Refit(requests, CancellationToken.None);
        var failures = new HashSet<FitStatus>();
        var exactly = 0;
        for (var r = 0; r < requests.Length; r++)
        {
            var exact = hard.Exact(requests[r]);
            if (exact.Status != FitStatus.Converged) failures.Add(exact.Status);
            Assert.Equal(exact.Status, outcomes[r].Status);
            Assert.Equal(exact.FailureKind, outcomes[r].FailureKind);
            Assert.Equal(exact.FailedParameters.AsEnumerable(), outcomes[r].FailedParameters);
            if (exact.Status != FitStatus.Converged) Assert.True(double.IsNaN(outcomes[r].Decrement));
            if (exact.Parameters.SequenceEqual(outcomes[r].Parameters) && exact.Iterations == outcomes[r].Iterations) exactly++;
        }

        Assert.Equal(requests.Length - settled, exactly);
        Assert.Contains(FitStatus.Boundary, failures);
    }

    [Fact]
    public void A_held_parameter_stays_at_the_full_estimate_and_the_rest_moves_to_its_maximum()
    {
        var request = Small.Draws(1)[0] with { Held = [2, Small.Model.Layout.Count - 1] };
        var outcome = Small.SideBySide([request], 1e-9)[0];
        Assert.NotNull(outcome);
        foreach (var k in request.Held) Assert.Equal(Small.Model.Parameters[k], outcome.Parameters[k]);
        Assert.InRange(Small.Distance(request, outcome), 0, 1e-9);
    }

    [Fact]
    public void Where_Hessians_would_take_too_much_that_of_the_sample_serves()
    {
        var replicates = Large.Value;
        var clusters = replicates.Model.Design.Clusters.Length;
        var n = replicates.Model.Layout.Free.Length;
        var requests = replicates.Draws(8);
        foreach (var outcome in new ClusterRefitter(replicates.Model, 1, clusters * n).Refit(requests, CancellationToken.None).Select((o, r) => (o, r)))
            Assert.InRange(replicates.Distance(requests[outcome.r], outcome.o), 0, ClusterRefitter.Tolerance);
        Assert.Contains(replicates.SideBySide(requests, ClusterRefitter.Tolerance, clusters * n), o => o is not null);

        var without = new ClusterRefitter(replicates.Model, 1, 0).Refit(requests[..2], CancellationToken.None);
        for (var r = 0; r < 2; r++) Assert.Equal(replicates.Exact(requests[r]).Parameters.AsEnumerable(), without[r].Parameters);
    }

    [Fact]
    public void The_sums_at_the_full_estimate_are_those_of_the_weighted_likelihood()
    {
        var model = Small.Model;
        var expansion = ClusterExpansion.Of(model, model.Likelihood, model.Survey!.Scale, ClusterExpansion.MostEntries, CancellationToken.None)!;
        var request = Small.Draws(3)[2];
        var sums = expansion.At([Small.Draws(1)[0].ClusterWeight, request.ClusterWeight], 2)[1].At;
        var direct = model.Likelihood.Evaluate(model.Parameters.AsSpan(), PreparedRefit.Of(model, request).PersonWeight, Derivatives.Hessian);
        Assert.InRange(Likelihood.Kernels.Distance(direct.Gradient, sums.Gradient), 0, 1e-11);
        Assert.InRange(Likelihood.Kernels.Distance(direct.Hessian, sums.Hessian), 0, 1e-11);
    }

    [Fact]
    public void A_cancelled_batch_stops_and_the_refitter_can_be_used_again()
    {
        var refitter = new ClusterRefitter(Small.Model, 2);
        Assert.Throws<OperationCanceledException>(() => refitter.Refit(Small.Draws(4), new CancellationToken(true)));
        Assert.Equal(4, refitter.Refit(Small.Draws(4), CancellationToken.None).Length);
    }

    private static void SameBits(Replicates replicates, int count)
    {
        var requests = replicates.Draws(count).AddRange(replicates.Deletions(4));
        var whole = new ClusterRefitter(replicates.Model, 1).Refit(requests, CancellationToken.None);
        var shared = new ClusterRefitter(replicates.Model, 2).Refit(requests, CancellationToken.None);
        var two = new ClusterRefitter(replicates.Model, 2);
        ImmutableArray<RefitOutcome> parts = [.. two.Refit(requests[5..], CancellationToken.None).Reverse(), .. two.Refit(requests[..5], CancellationToken.None).Reverse()];
        var alone = new ClusterRefitter(replicates.Model, 1);
        for (var r = 0; r < requests.Length; r++)
        {
            AssertSame(whole[r], shared[r]);
            AssertSame(whole[r], parts[parts.Length - 1 - r]);
            if (r % 4 == 0) AssertSame(whole[r], alone.Refit([requests[r]], CancellationToken.None)[0]);
        }
    }

    private static void AssertSame(RefitOutcome a, RefitOutcome b)
    {
        Assert.Equal(a.Parameters.Select(BitConverter.DoubleToInt64Bits), b.Parameters.Select(BitConverter.DoubleToInt64Bits));
        Assert.Equal(BitConverter.DoubleToInt64Bits(a.LogLikelihood), BitConverter.DoubleToInt64Bits(b.LogLikelihood));
        Assert.Equal(BitConverter.DoubleToInt64Bits(a.Decrement), BitConverter.DoubleToInt64Bits(b.Decrement));
        Assert.Equal((a.Status, a.Iterations, a.Retried), (b.Status, b.Iterations, b.Retried));
    }
}
