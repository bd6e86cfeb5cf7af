using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Diagnostics;
using Xunit;

namespace PanelChoice.Tests.Diagnostics;

public class VerdictTests
{
    private const double Level = 0.05;

    [Theory]
    [InlineData(0.04, null, Verdict.Dependence, true, null)]
    [InlineData(0.06, null, Verdict.NoneFound, false, null)]
    [InlineData(0.04, 0.9, Verdict.NoneFound, false, false)]
    [InlineData(0.02, 0.9, Verdict.Dependence, true, false)]
    [InlineData(0.9, 0.02, Verdict.Dependence, false, true)]
    [InlineData(0.9, 0.04, Verdict.NoneFound, false, false)]
    [InlineData(0.02, 0.04, Verdict.Dependence, true, true)]
    [InlineData(0.04, 0.02, Verdict.Dependence, true, true)]
    [InlineData(0.04, 0.04, Verdict.NoneFound, false, false)]
    public void Two_tests_are_joined_by_Holms_correction(double detector, double? date, Verdict verdict, bool serial, bool? common) =>
        Assert.Equal(new JointVerdict(verdict, serial, common), VerdictRule.Judge(detector, date, Level));

    [Fact]
    public void The_detectors_p_value_is_exact_where_the_null_distribution_is_known()
    {
        const int draws = 20_000;
        var error = 3 * Math.Sqrt(0.05 * 0.95 / draws);
        // Independent scores: P(max of 6 < c) = Phi(c)^6. Identical scores: P(max < c) = Phi(c).
        var c = MathNet.Numerics.Distributions.Normal.InvCDF(0, 1, Math.Pow(0.95, 1.0 / 6));
        Assert.InRange(DecayGridDetector.PValue(c, Matrix<double>.Build.DenseIdentity(6), draws, 7), 0.05 - error, 0.05 + error);
        var same = Matrix<double>.Build.Dense(6, 6, 1);
        Assert.InRange(DecayGridDetector.PValue(1.6448536, same, draws, 7), 0.05 - error, 0.05 + error);
    }

    [Fact]
    public void The_detectors_p_value_is_never_zero_and_repeats_with_its_seed()
    {
        var identity = Matrix<double>.Build.DenseIdentity(2);
        Assert.Equal(1.0 / 1000, DecayGridDetector.PValue(50, identity, 999, 7));
        Assert.Equal(DecayGridDetector.PValue(1, identity, 999, 7), DecayGridDetector.PValue(1, identity, 999, 7));
        Assert.NotEqual(DecayGridDetector.PValue(1, identity, 999, 7), DecayGridDetector.PValue(1, identity, 999, 8));
    }

    [Theory]
    [InlineData(4)]
    [InlineData(20)]
    [InlineData(80)]
    public void The_date_scores_tail_is_that_of_a_chi_squared_variable_where_the_score_is_one(int freedom)
    {
        // The cube-root transform is good to about three digits of the tail; the normal tail would be off by a fifth at 20 degrees of freedom.
        const double cubeRootAccuracy = 0.02;
        foreach (var z in new[] { 1.0, 1.645, 2.5 })
        {
            var exact = 1 - MathNet.Numerics.Distributions.ChiSquared.CDF(freedom, freedom + (z * Math.Sqrt(2 * freedom)));
            Assert.InRange(DateMoment.UpperTail(z, Math.Sqrt(8.0 / freedom)) / exact, 1 - cubeRootAccuracy, 1 + cubeRootAccuracy);
        }

        Assert.Equal(MathNet.Numerics.Distributions.Normal.CDF(0, 1, -1.5), DateMoment.UpperTail(1.5, 0));
    }

    [Fact]
    public void A_rate_measured_on_larger_panels_says_that_this_one_is_smaller()
    {
        Assert.Contains("expect less", MeasuredRates.Power(2, 12, true), StringComparison.Ordinal);
        Assert.Contains("expect less", MeasuredRates.HitRateOf(DependenceCause.Taste, 40, 12)!.Source, StringComparison.Ordinal);
        Assert.DoesNotContain("expect less", MeasuredRates.Power(39, 20, true), StringComparison.Ordinal);
        Assert.DoesNotContain("expect less", MeasuredRates.HitRateOf(DependenceCause.Taste, 160, 25)!.Source, StringComparison.Ordinal);
    }

    [Fact]
    public void Measured_rates_are_quoted_for_the_nearest_simulated_size()
    {
        Assert.Equal(0.935, MeasuredRates.HitRateOf(DependenceCause.Habit, 45, 18)!.Rate, 12);
        Assert.Equal(0.095, MeasuredRates.HitRateOf(DependenceCause.Taste, 50, 4)!.Rate, 12);
        Assert.Contains("40 persons x 5 occasions", MeasuredRates.HitRateOf(DependenceCause.Taste, 50, 4)!.Source, StringComparison.Ordinal);
        Assert.Null(MeasuredRates.HitRateOf(DependenceCause.Unclear, 45, 18));
        Assert.Null(MeasuredRates.HitRateOf(null, 45, 18));
        Assert.Contains("44 percent", MeasuredRates.Power(40, 20, true), StringComparison.Ordinal);
        Assert.Contains("100 percent", MeasuredRates.Power(40, 20, false), StringComparison.Ordinal);
    }
}
