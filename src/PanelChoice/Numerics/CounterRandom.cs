using System.Buffers.Binary;
using System.Security.Cryptography;
using System.Text;

namespace PanelChoice.Numerics;

/// <summary>
/// A stream of random numbers that is a pure function of (seed, purpose, index): the generator Philox 4x32 with ten rounds
/// (Salmon, Moraes, Dror and Shaw 2011, "Parallel random numbers: as easy as 1, 2, 3"). No generator is ever shared, so that any
/// number of threads and any split of the work over machines draws the same bits.
/// </summary>
public sealed class CounterRandom : Random
{
    private readonly uint key0;
    private readonly uint key1;
    private readonly ulong index;
    private ulong block;
    private int used = 4;
    private (uint A, uint B, uint C, uint D) words;

    /// <summary>Opens the stream.</summary>
    /// <param name="seed">The user's seed.</param>
    /// <param name="purpose">What the draws are for; different purposes never share a stream.</param>
    /// <param name="index">Replicate, person, start: whatever is numbered.</param>
    public CounterRandom(long seed, string purpose, long index)
    {
        ArgumentNullException.ThrowIfNull(purpose);
        var text = Encoding.UTF8.GetBytes(purpose);
        var bytes = new byte[8 + text.Length];
        BinaryPrimitives.WriteInt64LittleEndian(bytes, seed);
        text.CopyTo(bytes, 8);
        var hash = SHA256.HashData(bytes);
        key0 = BinaryPrimitives.ReadUInt32LittleEndian(hash);
        key1 = BinaryPrimitives.ReadUInt32LittleEndian(hash.AsSpan(4));
        this.index = unchecked((ulong)index);
    }

    /// <summary>The next 32 bits.</summary>
    public uint NextUInt32()
    {
        if (used == 4)
        {
            words = Philox(((uint)block, (uint)(block >> 32), (uint)index, (uint)(index >> 32)), key0, key1);
            block++;
            used = 0;
        }

        return used++ switch { 0 => words.A, 1 => words.B, 2 => words.C, _ => words.D };
    }

    /// <summary>Ten rounds of Philox 4x32 on one counter.</summary>
    internal static (uint A, uint B, uint C, uint D) Philox((uint A, uint B, uint C, uint D) x, uint k0, uint k1)
    {
        for (var round = 0; round < 10; round++)
        {
            var p0 = 0xD2511F53UL * x.A;
            var p1 = 0xCD9E8D57UL * x.C;
            x = ((uint)(p1 >> 32) ^ x.B ^ k0, (uint)p1, (uint)(p0 >> 32) ^ x.D ^ k1, (uint)p0);
            k0 = unchecked(k0 + 0x9E3779B9);
            k1 = unchecked(k1 + 0xBB67AE85);
        }

        return x;
    }

    /// <summary>A number strictly inside (0, 1), with 53 random bits.</summary>
    public override double NextDouble()
    {
        var high = NextUInt32();
        var bits = (((ulong)high << 32) | NextUInt32()) >> 11;
        return (bits + 0.5) * (1.0 / (1UL << 53));
    }

    /// <inheritdoc/>
    protected override double Sample() => NextDouble();

    /// <inheritdoc/>
    public override int Next() => (int)(NextUInt32() >> 1);

    /// <summary>A whole number from 0 to <paramref name="maxValue"/> - 1, every one equally likely.</summary>
    /// <exception cref="ArgumentOutOfRangeException"><paramref name="maxValue"/> is not positive.</exception>
    public override int Next(int maxValue)
    {
        ArgumentOutOfRangeException.ThrowIfNegativeOrZero(maxValue);
        // Rejection of the incomplete last stretch: no value is favoured (Lemire 2019).
        var range = (uint)maxValue;
        while (true)
        {
            var product = (ulong)NextUInt32() * range;
            if ((uint)product >= unchecked(0u - range) % range) return (int)(product >> 32);
        }
    }

    /// <inheritdoc/>
    public override int Next(int minValue, int maxValue) => minValue + Next(maxValue - minValue);

    /// <inheritdoc/>
    public override void NextBytes(byte[] buffer)
    {
        ArgumentNullException.ThrowIfNull(buffer);
        for (var i = 0; i < buffer.Length; i++) buffer[i] = (byte)NextUInt32();
    }
}
