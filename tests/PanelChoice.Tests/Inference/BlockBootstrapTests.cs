using System.Collections.Immutable;
using FsCheck.Xunit;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

public class BlockBootstrapTests
{
    [Property(MaxTest = 60)]
    public void Every_record_keeps_its_length_and_is_made_of_whole_blocks_but_the_last(int seed, byte size, byte length)
    {
        int[] start = [0, 1 + (size % 40), 30 + (size % 40), 31 + (size % 40)];
        var block = 1 + (length % 12);
        var weights = BlockBootstrap.MovingWeights(seed, 3, start, block);
        var random = new CounterRandom(seed, "bootstrap moving", 3);
        for (var p = 0; p < 3; p++)
        {
            var n = start[p + 1] - start[p];
            var own = weights.Skip(start[p]).Take(n).ToArray();
            Assert.Equal(n, own.Sum());
            // The record written out, occasion after occasion.
            var drawn = new List<int>();
            var width = Math.Min(block, n);
            while (drawn.Count < n)
            {
                var first = random.Next(n - width + 1);
                drawn.AddRange(Enumerable.Range(first, width));
            }

            var counts = new double[n];
            foreach (var t in drawn.Take(n)) counts[t]++;
            Assert.Equal(counts, own);
        }
    }

    [Fact]
    public void Blocks_of_one_occasion_resample_occasions_inside_each_person()
    {
        int[] start = [0, 6, 7, 20];
        var random = new CounterRandom(7, "bootstrap moving", 11);
        var counts = new double[20];
        for (var p = 0; p < 3; p++)
            for (var t = start[p]; t < start[p + 1]; t++) counts[start[p] + random.Next(start[p + 1] - start[p])]++;
        Assert.Equal(counts, BlockBootstrap.MovingWeights(7, 11, start, 1).ToArray());
    }

    [Fact]
    public void A_refit_on_blocks_is_the_maximum_of_the_likelihood_with_its_occasions_counted_as_drawn()
    {
        var design = Small(81, 6, 20).Weighted(p => 1 + (0.25 * p)).Design();
        var (model, _) = NewtonRefitter.Fit(design, design.PlainStart());
        var draws = BlockBootstrap.Of(model, Settings(replicates: 5) with { Blocks = BootstrapBlocks.Moving, BlockLength = 4 }, null, 1)!;
        Assert.Equal((4, false, 6 * 5), (draws.Length, draws.IsAutomatic, draws.Blocks));
        var brute = new NewtonRefitter(new ScalarNestedLogit(design.BySituation("occasion", null, design.Situations), NestedLogitForm.UtilityScaled, 1), 1);
        for (var r = 0; r < 5; r++)
        {
            var request = new RefitRequest(draws.Weights!(r), model.Parameters, []);
            var expected = brute.Refit([request], CancellationToken.None)[0];
            var found = draws.Refitter!.Refit([request], CancellationToken.None)[0];
            Assert.Equal((FitStatus.Converged, FitStatus.Converged), (expected.Status, found.Status));
            for (var k = 0; k < design.Layout.Count; k++) Assert.Equal(expected.Parameters[k], found.Parameters[k], 1e-7);
            Assert.Equal(expected.LogLikelihood, found.LogLikelihood, 1e-7);
        }
    }

    [Fact]
    public void Days_are_drawn_for_all_persons_together()
    {
        var design = Small(82, 6, 20).Design();
        var (model, _) = NewtonRefitter.Fit(design, design.PlainStart());
        // Days that persons do not all share, out of order and with gaps.
        var days = Enumerable.Range(0, design.Situations).Select(s => (long)(((s * 7) % 25 * 3) - 10)).ToArray();
        var draws = BlockBootstrap.Of(model, Settings(replicates: 5) with { Blocks = BootstrapBlocks.Calendar, BlockLength = 3 }, CompactNumbers.Of(days), 1)!;
        var sorted = days.Distinct().Order().ToArray();
        Assert.Equal((sorted.Length + 2) / 3, draws.Blocks);
        var single = new ClusterRefitter(model with { Likelihood = LikelihoodKernel.Create(design.BySituation("occasion", null, design.Situations), model.Form, 1) }, 1);
        for (var r = 0; r < 5; r++)
        {
            var byDay = draws.Weights!(r);
            Assert.Equal(sorted.Length, byDay.Sum());
            Assert.Equal(sorted.Length, byDay.Length);
            var bySituation = days.Select(d => byDay[Array.IndexOf(sorted, d)]).ToImmutableArray();
            var a = draws.Refitter!.Refit([new RefitRequest(byDay, model.Parameters, [])], CancellationToken.None)[0];
            var b = single.Refit([new RefitRequest(bySituation, model.Parameters, [])], CancellationToken.None)[0];
            Assert.Equal(a.Status, b.Status);
            if (a.Status == FitStatus.Converged)
                for (var k = 0; k < design.Layout.Count; k++) Assert.Equal(a.Parameters[k], b.Parameters[k], 1e-7);
        }
    }

    [Theory]
    [InlineData(BootstrapBlocks.Moving)]
    [InlineData(BootstrapBlocks.Calendar)]
    public void Threads_change_no_bit_and_what_needs_persons_is_refused(BootstrapBlocks blocks)
    {
        var design = Small(83, 8, 24).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var days = CompactNumbers.Of(Enumerable.Range(0, design.Situations).Select(s => (long)(s % 24)));
        var settings = Settings(JackknifeKind.Refit, 120) with { Blocks = blocks };
        InferenceResult Compute(int threads) => StandardErrors.Compute(
            InferenceInput.From(model, refitter) with { Blocks = BlockBootstrap.Of(model, settings, days, threads) }, settings, new WorkContext(threads, null, CancellationToken.None));
        var one = Compute(1);
        var three = Compute(3);
        Assert.Equal(one.Bootstrap!.Estimates.ToArray(), three.Bootstrap!.Estimates.ToArray());
        Assert.Equal(one.Parameters.Select(p => p.BootstrapPercentile), three.Parameters.Select(p => p.BootstrapPercentile));
        Assert.True(one.Bootstrap.BlockLength >= 1 && one.Bootstrap.IsLengthAutomatic);
        Assert.NotNull(one.Parameters[0].ByKind[CovarianceKind.Bootstrap].StandardError);
        Assert.Contains("blocks", one.Parameters[0].AcceleratedReason, StringComparison.Ordinal);
        Assert.Contains("blocks", one.Parameters[0].StudentisedReason, StringComparison.Ordinal);
    }

    [Fact]
    public void Blocks_that_hold_everything_and_days_that_are_not_shared_are_refused_in_a_sentence()
    {
        var design = Small(84, 8, 5).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        string? Obstacle(BootstrapBlocks blocks, CompactNumbers? days)
        {
            var settings = Settings(replicates: 9) with { Blocks = blocks, BlockLength = 5 };
            var input = InferenceInput.From(model, refitter) with { Blocks = BlockBootstrap.Of(model, settings, days, 1) };
            var result = StandardErrors.Compute(input, settings, WorkContext.Quiet);
            Assert.Null(result.Bootstrap);
            return result.Covariances[CovarianceKind.Bootstrap].Refusal;
        }

        Assert.Contains("No person has more than the 5", Obstacle(BootstrapBlocks.Moving, null), StringComparison.Ordinal);
        Assert.Contains("no more than the 5 days", Obstacle(BootstrapBlocks.Calendar, CompactNumbers.Of(Enumerable.Range(0, 40).Select(s => (long)(s % 5)))), StringComparison.Ordinal);
        Assert.Contains("shared_calendar", Obstacle(BootstrapBlocks.Calendar, null), StringComparison.Ordinal);
    }

    [Fact]
    public void The_length_follows_the_published_rule_on_one_record()
    {
        var random = new CounterRandom(3, "block length", 0);
        var x = new double[400];
        for (var t = 0; t < x.Length; t++) x[t] = (t == 0 ? 0 : 0.6 * x[t - 1]) + MathNet.Numerics.Distributions.Normal.Sample(random, 0, 1);
        // The rule written out once more: autocovariances, the first lag after which five autocorrelations are within the bound, the flat-top sums.
        var mean = x.Average();
        double Gamma(int k) => Enumerable.Range(k, x.Length - k).Sum(t => (x[t] - mean) * (x[t - k] - mean)) / x.Length;
        var bound = 2 * Math.Sqrt(Math.Log10(400) / 400);
        var quiet = Enumerable.Range(0, 26).First(m => Enumerable.Range(m + 1, 5).All(k => Math.Abs(Gamma(k) / Gamma(0)) < bound));
        var width = 2 * Math.Max(1, quiet);
        double H(double u) => Math.Abs(u) <= 0.5 ? 1 : 2 * (1 - Math.Abs(u));
        var g = Enumerable.Range(-width, (2 * width) + 1).Sum(k => H(k / (double)width) * Math.Abs(k) * Gamma(Math.Abs(k)));
        var s = Enumerable.Range(-width, (2 * width) + 1).Sum(k => H(k / (double)width) * Gamma(Math.Abs(k)));
        var length = Math.Cbrt(2 * g * g / (4 / 3.0 * s * s)) * Math.Cbrt(400);
        Assert.InRange(length, 4, 40);
        Assert.Equal((int)Math.Round(length), BlockLength.Of(x, [0, 400]));
    }

    [Fact]
    public void Without_dependence_blocks_are_short_and_a_record_bounds_them()
    {
        var random = new CounterRandom(4, "block length", 0);
        var noise = Enumerable.Range(0, 600).Select(_ => MathNet.Numerics.Distributions.Normal.Sample(random, 0, 1)).ToArray();
        Assert.InRange(BlockLength.Of(noise, [0, 600]), 1, 4);
        // A trend inside records of 9 depends without end: a third of a record is the most.
        var trend = Enumerable.Range(0, 90).Select(t => (double)(t % 9)).ToArray();
        Assert.Equal(3, BlockLength.Of(trend, [.. Enumerable.Range(0, 11).Select(i => 9 * i)]));
        Assert.Equal(1, BlockLength.Of(new double[20], [0, 20]));
    }
}
