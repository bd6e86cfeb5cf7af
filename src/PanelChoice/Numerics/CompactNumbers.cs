using System.Buffers.Binary;
using System.Runtime.InteropServices;

namespace PanelChoice.Numerics;

/// <summary>
/// Many whole numbers in little memory: each run of 65,536 is held as distances from its smallest, in as few bytes as its largest needs. Occasion
/// numbers of a panel take one or two bytes each.
/// </summary>
internal sealed class CompactNumbers
{
    private const int RunLength = 1 << 16;

    private readonly List<Run> runs;

    private CompactNumbers(List<Run> runs, int count)
    {
        this.runs = runs;
        Count = count;
    }

    /// <summary>How many there are.</summary>
    public int Count { get; }

    /// <summary>A number.</summary>
    public long this[int index] => runs[index / RunLength][index % RunLength];

    /// <summary>The numbers given.</summary>
    public static CompactNumbers Of(IEnumerable<long> numbers)
    {
        var builder = new Builder();
        foreach (var number in numbers) builder.Add(number);
        return builder.Finish();
    }

    /// <summary>Writes them: the number of them, then for each run its smallest, the bytes of each and the distances.</summary>
    public void Write(BinaryWriter to)
    {
        to.Write(Count);
        foreach (var run in runs)
        {
            to.Write(run.Smallest);
            to.Write((byte)run.Width);
            to.Write(run.Bytes);
        }
    }

    /// <summary>Reads what <see cref="Write"/> wrote.</summary>
    /// <exception cref="InvalidDataException">It is something else.</exception>
    /// <exception cref="EndOfStreamException">It ends too early.</exception>
    public static CompactNumbers Read(BinaryReader from)
    {
        var count = from.ReadInt32();
        var runs = new List<Run>();
        for (var left = count; left > 0; left -= RunLength)
        {
            var smallest = from.ReadInt64();
            int width = from.ReadByte();
            if (width is not (1 or 2 or 4 or 8)) throw new InvalidDataException($"Numbers of {width} bytes.");
            var bytes = from.ReadBytes(Math.Min(left, RunLength) * width);
            if (bytes.Length < Math.Min(left, RunLength) * width) throw new EndOfStreamException();
            runs.Add(new Run(smallest, width, bytes));
        }

        return new CompactNumbers(runs, count);
    }

    /// <summary>Takes numbers one after the other.</summary>
    public sealed class Builder
    {
        private readonly List<Run> runs = [];
        private readonly List<long> open = [];
        private int count;

        /// <summary>Adds a number.</summary>
        public void Add(long number)
        {
            open.Add(number);
            count++;
            if (open.Count == RunLength) Close();
        }

        /// <summary>The numbers added.</summary>
        public CompactNumbers Finish()
        {
            if (open.Count > 0) Close();
            return new CompactNumbers(runs, count);
        }

        private void Close()
        {
            var smallest = open.Min();
            var largest = unchecked((ulong)(open.Max() - smallest));
            var width = largest switch { <= byte.MaxValue => 1, <= ushort.MaxValue => 2, <= uint.MaxValue => 4, _ => 8 };
            var bytes = new byte[open.Count * width];
            Span<byte> whole = stackalloc byte[8];
            for (var i = 0; i < open.Count; i++)
            {
                BinaryPrimitives.WriteUInt64LittleEndian(whole, unchecked((ulong)(open[i] - smallest)));
                whole[..width].CopyTo(bytes.AsSpan(i * width));
            }

            runs.Add(new Run(smallest, width, bytes));
            open.Clear();
        }
    }

    private sealed record Run(long Smallest, int Width, byte[] Bytes)
    {
        public long this[int index] => unchecked(Smallest + (long)(Width switch
        {
            1 => Bytes[index],
            2 => MemoryMarshal.Cast<byte, ushort>(Bytes)[index],
            4 => MemoryMarshal.Cast<byte, uint>(Bytes)[index],
            _ => MemoryMarshal.Cast<byte, ulong>(Bytes)[index],
        }));
    }
}
