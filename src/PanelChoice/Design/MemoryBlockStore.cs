using System.Runtime.InteropServices;

namespace PanelChoice.Design;

/// <summary>Blocks in memory. They are appended in order while a design is built and never written to afterwards.</summary>
/// <param name="format">How each is laid out.</param>
public sealed class MemoryBlockStore(BlockFormat format) : BlockStore(format), IBlockTarget
{
    /// <summary>Blocks share arrays; each is twice as long as the one before, up to this size: few arrays, and little waste in small panels.</summary>
    private const int LongestArray = 16 << 20;

    /// <summary>Up to this size a store stays in a core's second-level cache from pass to pass.</summary>
    private const int NearBytes = 2 << 20;

    private readonly List<(byte[] Bytes, int Start)> places = [];
    private int free;
    private long bytes;

    /// <inheritdoc/>
    public override long Bytes => bytes;

    /// <summary>Number of blocks.</summary>
    internal int Count => places.Count;

    /// <inheritdoc/>
    public override BlockReader Reader() => new MemoryReader(this);

    /// <inheritdoc/>
    Span<byte> IBlockSink.Append(int lanes) => Append(lanes);

    /// <inheritdoc/>
    BlockStore IBlockTarget.Complete() => this;

    /// <summary>Makes room for the next block.</summary>
    /// <param name="lanes">Its lanes.</param>
    /// <returns>The block's bytes, all 0, to be filled.</returns>
    internal Span<byte> Append(int lanes)
    {
        var size = Format.Bytes(lanes);
        var (array, start) = places.Count > 0 ? (places[^1].Bytes, free) : ([], 0);
        if (array.Length - start < size) (array, start) = NewArray(Math.Max(size, Math.Min(LongestArray, 2 * array.Length)));
        places.Add((array, start));
        free = start + size;
        bytes += size;
        return array.AsSpan(start, size);
    }

    private static (byte[] Array, int Start) NewArray(int size)
    {
        var array = GC.AllocateArray<byte>(checked(size + BlockFormat.Line), pinned: true);
        var past = (int)(Marshal.UnsafeAddrOfPinnedArrayElement(array, 0) % BlockFormat.Line);
        return (array, (BlockFormat.Line - past) % BlockFormat.Line);
    }

    private sealed class MemoryReader(MemoryBlockStore store) : BlockReader(store.Format)
    {
        private byte seen;

        private protected override (byte[] Bytes, int Start) Fetch(DesignBlock block)
        {
            var (bytes, start) = store.places[block.Index];
            if (store.Bytes > NearBytes) seen ^= Touch(bytes.AsSpan(start, store.Format.Bytes(block.Lanes)));
            return (bytes, start);
        }

        /// <summary>
        /// Reads one byte of each cache line in one forward stream. A pass reads several columns side by side, and each is short: the machine's
        /// prefetching, which follows streams, would start anew with every column. A gradient pass over 300,000 situations took a quarter longer so.
        /// </summary>
        private static byte Touch(ReadOnlySpan<byte> block)
        {
            byte all = 0;
            for (var i = 0; i < block.Length; i += BlockFormat.Line) all ^= block[i];
            return all;
        }
    }
}
