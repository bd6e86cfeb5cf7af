using PanelChoice.Numerics;
using Xunit;

namespace PanelChoice.Tests.Numerics;

public class CounterRandomTests
{
    // Known answers of Philox 4x32 with ten rounds, published beside Salmon, Moraes, Dror and Shaw (2011); quoted from memory.
    [Fact]
    public void Philox_gives_the_published_known_answers()
    {
        Assert.Equal((0x6627e8d5u, 0xe169c58du, 0xbc57ac4cu, 0x9b00dbd8u), CounterRandom.Philox((0, 0, 0, 0), 0, 0));
        Assert.Equal(
            (0x408f276du, 0x41c83b0eu, 0xa20bc7c6u, 0x6d5451fdu),
            CounterRandom.Philox((0xffffffff, 0xffffffff, 0xffffffff, 0xffffffff), 0xffffffff, 0xffffffff));
        Assert.Equal(
            (0xd16cfe09u, 0x94fdccebu, 0x5001e420u, 0x24126ea1u),
            CounterRandom.Philox((0x243f6a88, 0x85a308d3, 0x13198a2e, 0x03707344), 0xa4093822, 0x299f31d0));
    }

    [Fact]
    public void A_stream_depends_on_seed_purpose_and_index_alone()
    {
        double[] Draw(long seed, string purpose, long index)
        {
            var r = new CounterRandom(seed, purpose, index);
            return [.. Enumerable.Range(0, 9).Select(_ => r.NextDouble())];
        }

        Assert.Equal(Draw(7, "bootstrap", 3), Draw(7, "bootstrap", 3));
        Assert.NotEqual(Draw(7, "bootstrap", 3), Draw(7, "bootstrap", 4));
        Assert.NotEqual(Draw(7, "bootstrap", 3), Draw(8, "bootstrap", 3));
        Assert.NotEqual(Draw(7, "bootstrap", 3), Draw(7, "starts", 3));
    }

    [Fact]
    public void Whole_numbers_are_equally_likely()
    {
        var r = new CounterRandom(1, "test", 0);
        var counts = new int[7];
        for (var i = 0; i < 70_000; i++) counts[r.Next(7)]++;
        var chiSquare = counts.Sum(c => (c - 10_000.0) * (c - 10_000.0) / 10_000.0);

        // 99.9 percent point of chi-square with 6 degrees of freedom: 22.46 (any table of the distribution).
        Assert.InRange(chiSquare, 0, 22.46);
    }

    [Fact]
    public void Fractions_lie_strictly_inside_zero_and_one_with_mean_one_half()
    {
        var r = new CounterRandom(2, "test", 0);
        var draws = Enumerable.Range(0, 100_000).Select(_ => r.NextDouble()).ToArray();
        Assert.All(draws, d => Assert.InRange(d, double.Epsilon, 1 - 1e-17));
        Assert.InRange(draws.Average(), 0.5 - (4 * 0.000913), 0.5 + (4 * 0.000913));
    }
}
