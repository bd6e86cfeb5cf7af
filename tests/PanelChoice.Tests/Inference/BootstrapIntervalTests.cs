using MathNet.Numerics.Distributions;
using PanelChoice.Design;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

public class BootstrapIntervalTests
{
    private static double[] OneTo(int n) => [.. Enumerable.Range(1, n).Select(i => (double)i)];

    [Fact]
    public void Without_bias_and_skewness_the_accelerated_interval_is_the_percentile_interval()
    {
        var (interval, _, reason) = AcceleratedInterval.Of(OneTo(399), 200, 0, 0.95);
        Assert.Null(reason);
        var plain = Percentiles.Of(OneTo(399), 0, 0.95).Interval!;
        Assert.Equal(plain.Low, interval!.Low, 1e-9);
        Assert.Equal(plain.High, interval.High, 1e-9);
    }

    [Fact]
    public void The_accelerated_interval_follows_the_published_formula_on_a_small_array()
    {
        // z0 from 250 of 999 below, a = 0.1; levels by Efron (1987), worked out here with the distribution functions alone.
        var (interval, _, _) = AcceleratedInterval.Of(OneTo(999), 250.5, 0.1, 0.9);
        var z0 = Normal.InvCDF(0, 1, 250 / 999.0);
        double Level(double z) => Normal.CDF(0, 1, z0 + ((z0 + z) / (1 - (0.1 * (z0 + z)))));
        // The k-th of 1, 2, ..., 999 is k, so that the quantile at level p is p (n + 1).
        Assert.Equal(1000 * Level(-1.6448536269514722), interval!.Low, 1e-6);
        Assert.Equal(1000 * Level(1.6448536269514722), interval.High, 1e-6);
    }

    [Fact]
    public void The_acceleration_is_a_sixth_of_the_skewness_of_the_leave_one_out_values()
    {
        // Influence values 4, -1, -1, -1, -1: sum of cubes 60, of squares 20.
        Assert.Equal(60 / (6 * Math.Pow(20, 1.5)), AcceleratedInterval.Acceleration([-4, 1, 1, 1, 1]), 1e-15);
        Assert.Equal(0, AcceleratedInterval.Acceleration([-2, -1, 0, 1, 2]), 1e-15);
    }

    [Theory]
    [InlineData(0.5)]
    [InlineData(399.5)]
    public void An_infinite_bias_correction_refuses_the_accelerated_interval(double estimate)
    {
        var (interval, errors, reason) = AcceleratedInterval.Of(OneTo(399), estimate, 0, 0.95);
        Assert.Null(interval);
        Assert.Null(errors);
        Assert.Contains("infinite", reason, StringComparison.Ordinal);
    }

    [Fact]
    public void The_accelerated_interval_needs_a_full_jackknife_without_failures()
    {
        var input = new LinearToy(61, 20, _ => 4).Input();
        foreach (var (kind, part) in new[] { (JackknifeKind.OneStep, "needs a full refit"), (JackknifeKind.Off, "needs a full refit") })
        {
            var result = StandardErrors.Compute(input, Settings(kind, 99), WorkContext.Quiet);
            Assert.All(result.Parameters, p => Assert.Contains(part, p.AcceleratedReason, StringComparison.Ordinal));
            Assert.All(result.Parameters, p => Assert.Null(p.BootstrapErrors!.Accelerated));
        }

        Assert.All(StandardErrors.Compute(input, Settings(JackknifeKind.Refit, 399), WorkContext.Quiet).Parameters, p => Assert.NotNull(p.BootstrapAccelerated));
    }

    [Fact]
    public void Bootstrap_t_turns_the_quantiles_of_the_studentised_replicates_around()
    {
        // t* = 1, 2, ..., 39 over replicates with standard error 2 in each: the 90 percent ends are t(2) and t(38).
        var values = OneTo(39).Select(t => 10 + (2 * t)).ToArray();
        var errors = Enumerable.Repeat(2.0, 39).ToArray();
        var (interval, error, _) = StudentisedInterval.Of(ParameterKind.Coefficient, 10, 0.5, values, errors, 0.9);
        Assert.Equal(10 - (38 * 0.5), interval!.Low, 1e-12);
        Assert.Equal(10 - (2 * 0.5), interval.High, 1e-12);
        Assert.True(error!.Low > 0 && error.High > 0);

        // A dissimilarity goes by its logarithm, whose standard error is se / l.
        var logs = OneTo(39).Select(t => 0.5 * Math.Exp(0.01 * t)).ToArray();
        var own = logs.Select(l => 0.01 * l).ToArray();
        (interval, _, _) = StudentisedInterval.Of(ParameterKind.Dissimilarity, 0.5, 0.1, logs, own, 0.9);
        Assert.Equal(0.5 * Math.Exp(-38 * 0.2), interval!.Low, 1e-12);
        Assert.Equal(0.5 * Math.Exp(-2 * 0.2), interval.High, 1e-12);
    }

    [Fact]
    public void A_replicate_without_a_standard_error_counts_at_both_extremes_of_bootstrap_t()
    {
        var values = OneTo(39).Select(t => 10 + t).ToArray();
        var errors = Enumerable.Repeat(1.0, 39).ToArray();
        errors[20] = double.NaN;
        var (interval, _, _) = StudentisedInterval.Of(ParameterKind.Coefficient, 10, 1, values, errors, 0.9);
        Assert.Equal(10 - 39, interval!.Low, 1e-12);
        Assert.Equal(10 - 1, interval.High, 1e-12);
    }

    [Fact]
    public void The_standard_error_inside_a_replicate_is_the_clustered_one_of_a_panel_of_cloned_persons()
    {
        var made = Small(62, 18, 6).Weighted(p => 1 + (0.1 * p));
        var design = made.Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var result = StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(replicates: 2), WorkContext.Quiet);
        for (var r = 0; r < 2; r++)
        {
            var weights = ClusterDraw.Weights(7, r, 18);
            var clones = made.Pick([.. Enumerable.Range(0, 18).SelectMany(p => Enumerable.Repeat(p, (int)weights[p]))]).Design();
            var (fresh, other) = NewtonRefitter.Fit(clones, clones.PlainStart());
            var expected = StandardErrors.Compute(InferenceInput.From(fresh, other), Settings(), WorkContext.Quiet);
            for (var i = 0; i < expected.Parameters.Length; i++)
            {
                var se = expected.Parameters[i].ByKind[CovarianceKind.Cluster].StandardError!.Value;
                Assert.InRange(Math.Abs(result.Bootstrap!.ClusterErrors[(r * expected.Parameters.Length) + i] - se), 0, 1e-8 * Math.Max(1, se));
            }
        }
    }

    [Fact]
    public void Threads_change_no_bit_of_the_standard_errors_inside_replicates()
    {
        var design = Small(63, 16, 6).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var input = InferenceInput.From(model, refitter);
        var one = StandardErrors.Compute(input, Settings(replicates: 40), WorkContext.Quiet).Bootstrap!.ClusterErrors;
        var two = StandardErrors.Compute(input, Settings(replicates: 40), new WorkContext(3, null, CancellationToken.None)).Bootstrap!.ClusterErrors;
        Assert.Equal(one.ToArray(), two.ToArray());
    }

    [Fact]
    public void A_study_can_switch_bootstrap_t_off_and_a_large_sample_waits_to_be_asked()
    {
        var design = Small(64, 16, 6).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var input = InferenceInput.From(model, refitter);
        var off = StandardErrors.Compute(input, Settings(replicates: 40) with { Studentised = false }, WorkContext.Quiet);
        Assert.All(off.Parameters, p => Assert.Contains("switches it off", p.StudentisedReason, StringComparison.Ordinal));
        var many = off.Bootstrap! with { Requested = (int)(ReplicateErrors.MostUnasked / input.Contributions) + 1 };
        Assert.Contains("asks for them", ReplicateErrors.Obstacle(input, Settings(), many), StringComparison.Ordinal);
        Assert.Null(ReplicateErrors.Obstacle(input, Settings() with { Studentised = true }, many));
    }

    [Fact]
    public void The_error_of_a_standard_error_grows_with_the_tails()
    {
        // Two values have the least kurtosis there is, 1: their standard deviation is hardly uncertain at all.
        Assert.Equal(0, MonteCarloErrors.OfStandardError(2, [-1, 1, -1, 1]), 1e-12);
        // Kurtosis of -3, 0 (seven times), 3: (2 x 81 / 9) / (18 / 9)^2 = 4.5.
        double[] tails = [-3, 0, 0, 0, 0, 0, 0, 0, 3];
        Assert.Equal(4.5, MonteCarloErrors.Kurtosis(tails), 1e-12);
        Assert.Equal(2 * Math.Sqrt(3.5 / 36), MonteCarloErrors.OfStandardError(2, tails), 1e-12);
    }

    [Fact]
    public void The_errors_of_quantiles_and_standard_errors_are_those_of_repeated_simulation()
    {
        // 400 sets of 199 normal draws: the errors' own mean is held against the spread over sets, whose relative error is 1 / sqrt(800) = 3.5 percent.
        var lows = new double[400];
        var errors = new double[400];
        var spreads = new double[400];
        var spreadErrors = new double[400];
        for (var s = 0; s < 400; s++)
        {
            var random = new CounterRandom(5, "monte-carlo errors", s);
            var x = Enumerable.Range(0, 199).Select(_ => Normal.Sample(random, 0, 1)).Order().ToArray();
            lows[s] = Percentiles.Of(x, 0, 0.9).Interval!.Low;
            errors[s] = Percentiles.Errors(x, 0, 0.9).Low;
            spreads[s] = MathNet.Numerics.Statistics.ArrayStatistics.StandardDeviation(x);
            spreadErrors[s] = MonteCarloErrors.OfStandardError(spreads[s], x);
        }

        Assert.InRange(errors.Average() / MathNet.Numerics.Statistics.ArrayStatistics.StandardDeviation(lows), 0.88, 1.12);
        Assert.InRange(spreadErrors.Average() / MathNet.Numerics.Statistics.ArrayStatistics.StandardDeviation(spreads), 0.88, 1.12);
    }

    [Fact]
    public void The_errors_of_accelerated_ends_are_those_of_repeated_simulation()
    {
        var lows = new double[400];
        var errors = new double[400];
        for (var s = 0; s < 400; s++)
        {
            var random = new CounterRandom(6, "monte-carlo errors", s);
            var x = Enumerable.Range(0, 399).Select(_ => Normal.Sample(random, 0, 1)).Order().ToArray();
            var (interval, error, _) = AcceleratedInterval.Of(x, 0.2, 0.03, 0.9);
            (lows[s], errors[s]) = (interval!.Low, error!.Low);
        }

        Assert.InRange(errors.Average() / MathNet.Numerics.Statistics.ArrayStatistics.StandardDeviation(lows), 0.88, 1.12);
    }
}
