using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;

namespace PanelChoice.Design;

/// <summary>Where the blocks of a design are kept.</summary>
/// <param name="format">How each is laid out.</param>
public abstract class BlockStore(BlockFormat format)
{
    /// <summary>How a block is laid out.</summary>
    public BlockFormat Format { get; } = format;

    /// <summary>Bytes of all blocks.</summary>
    public abstract long Bytes { get; }

    /// <summary>A new reader. A reader is not for use by several threads at once; several readers are.</summary>
    public abstract BlockReader Reader();
}

/// <summary>Reads the blocks of a store one at a time.</summary>
public abstract class BlockReader
{
    private readonly BlockFormat format;
    private readonly int[] columnOffset;
    private byte[] bytes = [];
    private int start;
    private int chosenOffset;

    /// <summary>A reader of blocks laid out in this format.</summary>
    private protected BlockReader(BlockFormat format)
    {
        this.format = format;
        columnOffset = new int[format.Columns.Length + 1];
    }

    /// <summary>The open block; null before the first.</summary>
    public DesignBlock? Block { get; private set; }

    /// <summary>Opens a block, if it is not open already. What was read from the block before is no longer valid.</summary>
    /// <param name="block">The block.</param>
    public void Open(DesignBlock block)
    {
        ArgumentNullException.ThrowIfNull(block);
        if (ReferenceEquals(Block, block)) return;
        if (Block?.Lanes != block.Lanes)
        {
            for (var c = 0; c < columnOffset.Length; c++) columnOffset[c] = format.ColumnOffset(c, block.Lanes);
            chosenOffset = format.ChosenOffset(block.Lanes);
        }

        (bytes, start) = Fetch(block);
        Block = block;
    }

    /// <summary>Whether an alternative is offered in a lane of the open block.</summary>
    public bool IsOffered(int lane, int alternative) => (OfferedMasks[(lane / ChoiceDesign.TileLanes * format.Alternatives) + alternative] >> (lane % ChoiceDesign.TileLanes) & 1) != 0;

    /// <summary>The alternative chosen in a lane of the open block; -1 in a padding lane.</summary>
    public int ChosenAt(int lane)
    {
        var masks = ChosenMasks.Slice(lane / ChoiceDesign.TileLanes * format.Alternatives, format.Alternatives);
        var alternative = masks.Length - 1;
        while (alternative >= 0 && (masks[alternative] >> (lane % ChoiceDesign.TileLanes) & 1) == 0) alternative--;
        return alternative;
    }

    /// <summary>The value of a stored column in a lane of the open block; 1 for column -1.</summary>
    public double Value(int column, int lane)
    {
        if (column < 0) return 1;
        var stored = format.Columns[column];
        ref var first = ref Column(column);
        return stored.Coding switch
        {
            ColumnCoding.Whole16 => Unsafe.Add(ref Unsafe.As<byte, short>(ref first), lane) / stored.Units,
            ColumnCoding.Whole32 => Unsafe.Add(ref Unsafe.As<byte, int>(ref first), lane) / stored.Units,
            _ => Unsafe.Add(ref Unsafe.As<byte, double>(ref first), lane),
        };
    }

    /// <summary>First byte of a stored column of the open block.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    internal ref byte Column(int column) => ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(bytes), start + columnOffset[column]);

    /// <summary>Availability masks of the open block.</summary>
    internal ReadOnlySpan<byte> OfferedMasks => Masks(columnOffset[^1]);

    /// <summary>Choice masks of the open block.</summary>
    internal ReadOnlySpan<byte> ChosenMasks => Masks(chosenOffset);

    /// <summary>The array and the place in it where a block's bytes begin, a multiple of <see cref="BlockFormat.Line"/> in memory.</summary>
    private protected abstract (byte[] Bytes, int Start) Fetch(DesignBlock block);

    /// <summary>Where another reader's store keeps a block.</summary>
    private protected static (byte[] Bytes, int Start) FetchFrom(BlockReader other, DesignBlock block) => other.Fetch(block);

    private ReadOnlySpan<byte> Masks(int offset) => bytes.AsSpan(start + offset, Block!.Lanes / ChoiceDesign.TileLanes * format.Alternatives);
}
