using System.Runtime.InteropServices;
using Microsoft.Win32.SafeHandles;

namespace PanelChoice.Design.Store;

/// <summary>
/// Blocks that stand one after the other in a file. A reader holds one buffer of a megabyte and reads as many whole blocks at a time as fit into it while
/// blocks are opened in order; the first blocks may be held in memory. Nothing else of the file is, and it is never mapped.
/// </summary>
/// <param name="format">How each block is laid out.</param>
/// <param name="file">The file, open for reading.</param>
/// <param name="firstByte">Where the first block begins.</param>
/// <param name="blocks">The blocks.</param>
/// <param name="held">The first blocks, in memory.</param>
internal sealed class FileBlockStore(
    BlockFormat format, SafeFileHandle file, long firstByte, IReadOnlyList<DesignBlock> blocks, MemoryBlockStore held) : BlockStore(format)
{
    /// <summary>Bytes read at a time: enough that the system call costs nothing beside the copy.</summary>
    public const int BufferBytes = 1 << 20;

    private readonly long[] offset = Offsets(format, firstByte, blocks);

    /// <inheritdoc/>
    public override long Bytes => offset[^1] - offset[0];

    /// <inheritdoc/>
    public override BlockReader Reader() => new FileReader(this, held.Reader());

    /// <summary>Where each block begins in the file; one more entry closes the last.</summary>
    public static long[] Offsets(BlockFormat format, long firstByte, IReadOnlyList<DesignBlock> blocks)
    {
        var offset = new long[blocks.Count + 1];
        offset[0] = firstByte;
        var bytesOf = new Dictionary<int, int>();
        for (var b = 0; b < blocks.Count; b++)
        {
            if (!bytesOf.TryGetValue(blocks[b].Lanes, out var bytes)) bytesOf[blocks[b].Lanes] = bytes = format.Bytes(blocks[b].Lanes);
            offset[b + 1] = offset[b] + bytes;
        }

        return offset;
    }

    /// <summary>Fills a buffer from a place in the file.</summary>
    /// <exception cref="IOException">The file ends before, or cannot be read.</exception>
    public static void ReadExactly(SafeFileHandle file, Span<byte> buffer, long at)
    {
        while (buffer.Length > 0)
        {
            var read = RandomAccess.Read(file, buffer, at);
            if (read == 0) throw new EndOfStreamException("the file ends before it should");
            buffer = buffer[read..];
            at += read;
        }
    }

    private sealed class FileReader(FileBlockStore store, BlockReader inMemory) : BlockReader(store.Format)
    {
        private byte[] buffer = [];
        private int start;
        private int firstBlock;
        private int endBlock;
        private int atOnce = 1;

        private protected override (byte[] Bytes, int Start) Fetch(DesignBlock block)
        {
            if (block.Index < store.HeldBlocks) return FetchFrom(inMemory, block);
            if (block.Index < firstBlock || block.Index >= endBlock) Fill(block.Index);
            return (buffer, start + (int)(store.offset[block.Index] - store.offset[firstBlock]));
        }

        private void Fill(int block)
        {
            // Blocks are skipped where nobody in them counts: what lies ahead is read only once blocks come in order.
            atOnce = block == endBlock ? Math.Min(2 * atOnce, int.MaxValue / 4) : 1;
            var end = block + 1;
            while (end - block < atOnce && end + 1 < store.offset.Length && store.offset[end + 1] - store.offset[block] <= BufferBytes) end++;
            var bytes = checked((int)(store.offset[end] - store.offset[block]));
            if (buffer.Length < bytes + BlockFormat.Line)
            {
                buffer = GC.AllocateArray<byte>(Math.Max(bytes, atOnce > 1 ? BufferBytes : bytes) + BlockFormat.Line, pinned: true);
                var past = (int)(Marshal.UnsafeAddrOfPinnedArrayElement(buffer, 0) % BlockFormat.Line);
                start = (BlockFormat.Line - past) % BlockFormat.Line;
            }

            // What the buffer held is gone even where the file cannot be read.
            (firstBlock, endBlock) = (0, 0);
            try
            {
                ReadExactly(store.File, buffer.AsSpan(start, bytes), store.offset[block]);
            }
            catch (Exception e) when (e is IOException or UnauthorizedAccessException)
            {
                throw new StoreReadException(e);
            }

            (firstBlock, endBlock) = (block, end);
        }
    }

    private int HeldBlocks => held.Count;

    private SafeFileHandle File => file;
}
