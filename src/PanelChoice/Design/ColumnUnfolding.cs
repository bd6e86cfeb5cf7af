using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using System.Runtime.Intrinsics.X86;

namespace PanelChoice.Design;

/// <summary>Turns the held values of a column into doubles, in the units in which they are held.</summary>
internal static class ColumnUnfolding
{
    private const int Tile = ChoiceDesign.TileLanes;

    /// <summary>Unfolds a run of lanes of the open block.</summary>
    /// <param name="reader">Its reader.</param>
    /// <param name="column">The column.</param>
    /// <param name="stored">How it is held.</param>
    /// <param name="firstLane">First lane.</param>
    /// <param name="to">Receives the values; its length, a multiple of 8, says how many.</param>
    public static void Unfold(BlockReader reader, int column, StoredColumn stored, int firstLane, Span<double> to)
    {
        ref var from = ref reader.Column(column);
        switch (stored.Coding)
        {
            case ColumnCoding.Whole16:
                Unfold(ref Unsafe.Add(ref Unsafe.As<byte, short>(ref from), firstLane), to);
                break;
            case ColumnCoding.Whole32:
                Unfold(ref Unsafe.Add(ref Unsafe.As<byte, int>(ref from), firstLane), to);
                break;
            default:
                MemoryMarshal.CreateReadOnlySpan(ref Unsafe.Add(ref Unsafe.As<byte, double>(ref from), firstLane), to.Length).CopyTo(to);
                break;
        }
    }

    private static void Unfold(ref short from, Span<double> to)
    {
        ref var first = ref MemoryMarshal.GetReference(to);
        for (nuint lane = 0; lane < (nuint)to.Length; lane += Tile)
            Doubles(Whole32(Vector128.LoadUnsafe(ref from, lane))).StoreUnsafe(ref first, lane);
    }

    private static void Unfold(ref int from, Span<double> to)
    {
        ref var first = ref MemoryMarshal.GetReference(to);
        for (nuint lane = 0; lane < (nuint)to.Length; lane += Tile) Doubles(Vector256.LoadUnsafe(ref from, lane)).StoreUnsafe(ref first, lane);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    internal static Vector256<int> Whole32(Vector128<short> whole)
    {
        if (Avx2.IsSupported) return Avx2.ConvertToVector256Int32(whole);
        var (low, high) = Vector128.Widen(whole);
        return Vector256.Create(low, high);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    internal static Vector512<double> Doubles(Vector256<int> whole)
    {
        if (Avx512F.IsSupported) return Avx512F.ConvertToVector512Double(whole);
        var (low, high) = Vector256.Widen(whole);
        return Vector512.ConvertToDouble(Vector512.Create(low, high));
    }
}
