using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;

namespace PanelChoice.Likelihood;

/// <summary>
/// Rows of doubles that begin on a cache line, one lane for each situation of a strip: the memory in which the vector kernel works.
/// </summary>
internal sealed class StripRows
{
    private const int LineDoubles = 8;
    private readonly double[] memory;
    private readonly int start;

    /// <summary>Rows, all zero.</summary>
    /// <param name="rows">Number of rows.</param>
    /// <param name="lanes">Most lanes in a row.</param>
    public StripRows(int rows, int lanes)
    {
        // One line more than the lanes: rows a multiple of 4 KiB apart would make loads wait for stores of another row.
        Stride = lanes + LineDoubles;
        memory = GC.AllocateArray<double>((rows * Stride) + LineDoubles, pinned: true);
        var past = (int)(Marshal.UnsafeAddrOfPinnedArrayElement(memory, 0) % (LineDoubles * sizeof(double))) / sizeof(double);
        start = (LineDoubles - past) % LineDoubles;
    }

    /// <summary>Distance between two rows, in lanes.</summary>
    public int Stride { get; }

    /// <summary>First lane of a row.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public ref double Row(int row) => ref Unsafe.Add(ref MemoryMarshal.GetArrayDataReference(memory), start + (row * Stride));

    /// <summary>The first lanes of a row.</summary>
    public Span<double> Lanes(int row, int lanes) => memory.AsSpan(start + (row * Stride), lanes);
}
