using System.Collections.Immutable;
using System.Runtime.InteropServices;

namespace PanelChoice.Design;

/// <summary>How the values of a stored column are held.</summary>
public enum ColumnCoding
{
    /// <summary>As they are.</summary>
    AsIs,

    /// <summary>As 32-bit whole numbers n; the value is n / 10^decimals.</summary>
    Whole32,

    /// <summary>As 16-bit whole numbers n; the value is n / 10^decimals.</summary>
    Whole16,
}

/// <summary>A stored column.</summary>
/// <param name="Coding">How it is held. Whole numbers are used only where every value comes back equal.</param>
/// <param name="Decimals">Decimals of the values; 0 where they are held as doubles. The columns of one parameter share it.</param>
public readonly record struct StoredColumn(ColumnCoding Coding, int Decimals)
{
    /// <summary>Bytes of one value.</summary>
    public int Width => Coding switch { ColumnCoding.Whole16 => sizeof(short), ColumnCoding.Whole32 => sizeof(int), _ => sizeof(double) };

    /// <summary>10^decimals.</summary>
    public double Units => PowersOfTen[Decimals];

    /// <summary>10^0 to 10^9, each exact.</summary>
    internal static ReadOnlySpan<double> PowersOfTen => [1, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9];
}

/// <summary>
/// How the bytes of a block are laid out: the stored columns in order, the lanes of each contiguous; then the availability masks, then the
/// choice masks, one byte for each tile of 8 lanes and alternative (<c>tile * J + alternative</c>, bit = lane). Every column, the masks and
/// the end of the block are rounded up to 64 bytes, a cache line, because loads that straddle two lines take twice as long. Numbers are little-endian.
/// </summary>
/// <param name="Columns">The stored columns.</param>
/// <param name="Alternatives">J.</param>
public sealed record BlockFormat(ImmutableArray<StoredColumn> Columns, int Alternatives)
{
    /// <summary>Every part of a block begins on a multiple of this many bytes.</summary>
    public const int Line = 64;

    /// <summary>Bytes of a block.</summary>
    /// <param name="lanes">Its lanes, a multiple of 8.</param>
    public int Bytes(int lanes) => checked(ChosenOffset(lanes) + MaskBytes(lanes));

    /// <summary>Where a column begins; the place after the last one is where the availability masks begin.</summary>
    /// <param name="column">The column.</param>
    /// <param name="lanes">The block's lanes.</param>
    public int ColumnOffset(int column, int lanes)
    {
        var offset = 0;
        for (var c = 0; c < column; c++) offset = checked(offset + RoundUp(Columns[c].Width * lanes));
        return offset;
    }

    /// <summary>Where the choice masks begin.</summary>
    /// <param name="lanes">The block's lanes.</param>
    public int ChosenOffset(int lanes) => checked(ColumnOffset(Columns.Length, lanes) + MaskBytes(lanes));

    /// <summary>Writes the values of a column into a block.</summary>
    /// <param name="column">The column.</param>
    /// <param name="values">One value for each lane.</param>
    /// <param name="block">The block's bytes.</param>
    /// <exception cref="ArgumentException">A value does not come back from the column's coding.</exception>
    public void Encode(int column, ReadOnlySpan<double> values, Span<byte> block)
    {
        var stored = Columns[column];
        var into = block[ColumnOffset(column, values.Length)..];
        if (stored.Coding == ColumnCoding.AsIs)
        {
            MemoryMarshal.AsBytes(values).CopyTo(into);
            return;
        }

        for (var lane = 0; lane < values.Length; lane++)
        {
            var n = Math.Round(values[lane] * stored.Units);
            var back = stored.Coding == ColumnCoding.Whole16
                ? MemoryMarshal.Cast<byte, short>(into)[lane] = (short)n
                : MemoryMarshal.Cast<byte, int>(into)[lane] = (int)n;
            if (back / stored.Units != values[lane]) throw new ArgumentException($"The value {values[lane]:R} does not come back from column {column}'s coding.", nameof(values));
        }
    }

    private static int RoundUp(int bytes) => checked(bytes + Line - 1) / Line * Line;

    private int MaskBytes(int lanes) => RoundUp(lanes / ChoiceDesign.TileLanes * Alternatives);
}
