using System.Runtime.Intrinsics;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

/// <summary>
/// The exponential and logarithm of the kernels against <see cref="DoubleDouble"/>, an arithmetic of 31 digits with series of its own: no library
/// function stands between them, so the errors counted are those of the functions alone.
/// </summary>
public class VectorFunctionsTests
{
    private const double ExpWithin = 1;
    private const double LogWithin = 1;
    private const int Points = 1 << 18;

    [Theory]
    [InlineData(-708, 709.78)]
    [InlineData(-40, 0)]
    [InlineData(-1, 1)]
    [InlineData(-0.35, 0.35)]
    public void The_exponential_lies_within_one_unit_in_the_last_place(double from, double to)
    {
        var x = Seeded(from, to);
        Assert.InRange(WorstOfExp(x), 0.4, ExpWithin);
    }

    [Fact]
    public void The_exponential_lies_within_one_unit_in_the_last_place_where_its_reduction_changes_over_and_near_zero()
    {
        var x = new List<double>();
        for (var n = -1021; n <= 1023; n++) x.AddRange(Neighbours((n + 0.5) * Math.Log(2)));
        for (var n = -1021 * 16; n <= 1023 * 16; n += 5) x.AddRange(Neighbours((n + 0.5) * Math.Log(2) / 16));
        for (var n = -1074; n <= 9; n++) x.AddRange([.. Neighbours(Math.ScaleB(1, n)), .. Neighbours(-Math.ScaleB(1, n))]);
        Assert.InRange(WorstOfExp([.. x]), 0, ExpWithin);
    }

    [Theory]
    [InlineData(0.0, 1)]
    [InlineData(double.Epsilon, 1)]
    [InlineData(-double.Epsilon, 1)]
    [InlineData(2.2250738585072009e-308, 1)]
    [InlineData(-2.2250738585072009e-308, 1)]
    [InlineData(-708.0000000000001, 0)]
    [InlineData(-745.2, 0)]
    [InlineData(-1e4, 0)]
    [InlineData(-1e19, 0)]
    [InlineData(-1e100, 0)]
    [InlineData(-double.MaxValue, 0)]
    [InlineData(double.NegativeInfinity, 0)]
    [InlineData(709.7827128933841, double.PositiveInfinity)]
    [InlineData(710, double.PositiveInfinity)]
    [InlineData(1e19, double.PositiveInfinity)]
    [InlineData(double.MaxValue, double.PositiveInfinity)]
    [InlineData(double.PositiveInfinity, double.PositiveInfinity)]
    [InlineData(double.NaN, double.NaN)]
    public void The_exponential_is_exact_at_its_edges(double x, double expected)
    {
        AssertBits(expected, Exp(x));
        AssertBits(expected, PlainExp(x));
    }

    [Fact]
    public void Minus_zero_counts_as_zero()
    {
        AssertBits(1, Exp(-0.0));
        AssertBits(double.NegativeInfinity, Log(-0.0));
    }

    [Theory]
    [InlineData(-708)]
    [InlineData(-707.9999999999999)]
    [InlineData(709.7827128933839)]
    [InlineData(709.782712893384)]
    public void The_exponential_is_as_good_on_the_last_points_before_its_edges(double x)
    {
        Assert.InRange(Exp(x), 3e-308, double.MaxValue);
        Assert.InRange(PlainExp(x), 3e-308, double.MaxValue);
        Assert.InRange(WorstOfExp([x]), 0, ExpWithin);
    }

    [Theory]
    [InlineData(1, 8)]
    [InlineData(0.5, 2)]
    [InlineData(0.999, 1.001)]
    public void The_logarithm_lies_within_one_unit_in_the_last_place(double from, double to) => Assert.InRange(WorstOfLog(Seeded(from, to)), 0.4, LogWithin);

    [Fact]
    public void The_logarithm_lies_within_one_unit_in_the_last_place_over_all_normal_numbers()
    {
        // Uniform in the bits: as many points in every binade.
        var random = new CounterRandom(20310402, "points for the logarithm", 0);
        var first = BitConverter.DoubleToInt64Bits(Math.ScaleB(1, -1022));
        var last = BitConverter.DoubleToInt64Bits(double.MaxValue);
        Assert.InRange(WorstOfLog([.. Enumerable.Range(0, Points).Select(_ => BitConverter.Int64BitsToDouble(first + (long)(random.NextDouble() * (last - first))))]), 0.4, LogWithin);
    }

    [Fact]
    public void The_logarithm_lies_within_one_unit_in_the_last_place_next_to_one_and_where_its_reduction_changes_over()
    {
        var x = new List<double>();
        for (var n = -52; n < 0; n++) x.AddRange([.. Neighbours(1 + Math.ScaleB(1, n)), .. Neighbours(1 - Math.ScaleB(1, n - 1))]);
        for (var n = -1021; n <= 1023; n++) x.AddRange([.. Neighbours(Math.ScaleB(1, n)), .. Neighbours(Math.ScaleB(Math.Sqrt(0.5), n)), .. Neighbours(Math.ScaleB(BitConverter.Int64BitsToDouble(0x3FE6A09E00000000), n))]);
        Assert.InRange(WorstOfLog([.. x.Where(x => x != 1)]), 0, LogWithin);
    }

    [Theory]
    [InlineData(1.0, 0.0)]
    [InlineData(0.0, double.NegativeInfinity)]
    [InlineData(double.PositiveInfinity, double.PositiveInfinity)]
    [InlineData(-double.Epsilon, double.NaN)]
    [InlineData(-1.0, double.NaN)]
    [InlineData(-double.MaxValue, double.NaN)]
    [InlineData(double.NegativeInfinity, double.NaN)]
    [InlineData(double.NaN, double.NaN)]
    public void The_logarithm_is_exact_at_its_edges(double x, double expected) => AssertBits(expected, Log(x));

    [Theory]
    [InlineData(double.Epsilon)]
    [InlineData(2.2250738585072009e-308)]
    [InlineData(2.2250738585072014e-308)]
    [InlineData(0.9999999999999999)]
    [InlineData(1.0000000000000002)]
    [InlineData(double.MaxValue)]
    public void The_logarithm_is_as_good_on_subnormal_numbers_next_to_one_and_on_the_last_points(double x) => Assert.InRange(WorstOfLog([x]), 0, LogWithin);

    [Fact]
    public void A_lane_does_not_depend_on_its_neighbours()
    {
        double[] odd = [double.NaN, 0, -1, double.PositiveInfinity, double.Epsilon, -1e100, 800];
        double[] usual = [-3.25, 1, 0.5, 1.75, 6, double.NaN, double.Epsilon];
        foreach (var x in usual)
            foreach (var y in odd)
                for (var lane = 0; lane < 16; lane++)
                {
                    AssertBits(Exp(x), Exp(x, y, lane));
                    AssertBits(Log(x), Log(x, y, lane));
                }
    }

    private static double[] Seeded(double from, double to)
    {
        var random = new CounterRandom(20310402, "points", BitConverter.DoubleToInt64Bits(from) >>> 40);
        return [.. Enumerable.Range(0, Points).Select(_ => from + ((to - from) * random.NextDouble()))];
    }

    private static double[] Neighbours(double x) =>
        [Math.BitDecrement(Math.BitDecrement(x)), Math.BitDecrement(x), x, Math.BitIncrement(x), Math.BitIncrement(Math.BitIncrement(x))];

    private static double Exp(double x, double neighbours = 0, int lane = 3)
    {
        Span<double> from = stackalloc double[16];
        Span<double> to = stackalloc double[16];
        from.Fill(neighbours);
        from[lane] = x;
        VectorFunctions.Exp(ref from[0], ref to[0], 16);
        return to[lane];
    }

    /// <summary>The exponential of machines without 512-bit instructions.</summary>
    private static double PlainExp(double x) => VectorElementary.PlainExp(Vector512.Create(x))[0];

    private static double Log(double x, double neighbours = 1, int lane = 3)
    {
        Span<double> from = stackalloc double[16];
        Span<double> to = stackalloc double[16];
        from.Fill(neighbours);
        from[lane] = x;
        VectorFunctions.Log(ref from[0], ref to[0], 16);
        return to[lane];
    }

    private static double WorstOfExp(double[] x)
    {
        var worst = 0.0;
        foreach (var point in x)
        {
            var (power, exponent) = DoubleDouble.Exp(point);
            worst = Larger(worst, power.UnitsInLastPlaceTo(Math.ScaleB(Exp(point), -exponent)));
            worst = Larger(worst, power.UnitsInLastPlaceTo(Math.ScaleB(PlainExp(point), -exponent)));
        }

        return worst;
    }

    private static double WorstOfLog(double[] x)
    {
        var worst = 0.0;
        foreach (var point in x) worst = Larger(worst, DoubleDouble.Log(point).UnitsInLastPlaceTo(Log(point)));
        return worst;
    }

    /// <summary>The larger one, and NaN where either is.</summary>
    private static double Larger(double a, double b) => Math.Max(a, b);

    private static void AssertBits(double expected, double actual)
    {
        if (double.IsNaN(expected)) Assert.True(double.IsNaN(actual));
        else Assert.Equal(BitConverter.DoubleToInt64Bits(expected), BitConverter.DoubleToInt64Bits(actual));
    }
}
