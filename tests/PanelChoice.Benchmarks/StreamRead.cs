using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Benchmarks;

/// <summary>A plain read of every byte that a pass over a design reads: eight vectors of 64 bytes at a time, nothing done with them but a sum.</summary>
internal sealed unsafe class StreamRead(ChoiceDesign design)
{
    private readonly BlockReader reader = design.Store.Reader();

    /// <summary>Bytes of columns and masks.</summary>
    public long Bytes => design.Store.Bytes;

    /// <summary>Reads them all; the sum keeps the reads from being left out.</summary>
    public long Run()
    {
        var sum = 0L;
        foreach (var block in design.Blocks)
        {
            reader.Open(block);
            fixed (byte* first = &reader.Column(0)) sum += Sum((long*)first, design.Store.Format.Bytes(block.Lanes) / sizeof(long));
        }

        return sum;
    }

    /// <summary>Sums whole numbers; their count is a multiple of 8, because blocks end on cache lines.</summary>
    private static long Sum(long* at, int count)
    {
        Vector512<long> s0 = default, s1 = default, s2 = default, s3 = default, s4 = default, s5 = default, s6 = default, s7 = default;
        var end = at + count;
        for (; at + 64 <= end; at += 64)
        {
            s0 += Vector512.Load(at);
            s1 += Vector512.Load(at + 8);
            s2 += Vector512.Load(at + 16);
            s3 += Vector512.Load(at + 24);
            s4 += Vector512.Load(at + 32);
            s5 += Vector512.Load(at + 40);
            s6 += Vector512.Load(at + 48);
            s7 += Vector512.Load(at + 56);
        }

        for (; at < end; at += 8) s0 += Vector512.Load(at);
        return Vector512.Sum(s0 + s1 + (s2 + s3) + (s4 + s5 + (s6 + s7)));
    }
}
