using System.Globalization;
using System.Text;
using Parquet;
using Parquet.Schema;

namespace PanelChoice.Data;

/// <summary>Hands the cells of a decoded column, one after the other, to a column of the table.</summary>
internal delegate void ColumnFiller(CellColumn into, ReadOnlySpan<CellPlace> places);

/// <summary>Decodes one column of one row group.</summary>
internal delegate ColumnFiller ColumnDecoder(ParquetRowGroupReader group, DataField field);

/// <summary>How each type that Parquet stores becomes a cell.</summary>
internal static class ParquetDecoding
{
    private static readonly Dictionary<Type, ColumnDecoder> Decoders = new()
    {
        [typeof(double)] = DecoderOf<double>((into, at, v) => into.Number(at, v)),
        [typeof(float)] = DecoderOf<float>((into, at, v) => into.Number(at, v)),
        [typeof(decimal)] = DecoderOf<decimal>(PutDecimal),
        [typeof(long)] = DecoderOf<long>((into, at, v) => into.Whole(at, v)),
        [typeof(int)] = DecoderOf<int>((into, at, v) => into.Whole(at, v)),
        [typeof(short)] = DecoderOf<short>((into, at, v) => into.Whole(at, v)),
        [typeof(sbyte)] = DecoderOf<sbyte>((into, at, v) => into.Whole(at, v)),
        [typeof(byte)] = DecoderOf<byte>((into, at, v) => into.Whole(at, v)),
        [typeof(ushort)] = DecoderOf<ushort>((into, at, v) => into.Whole(at, v)),
        [typeof(uint)] = DecoderOf<uint>((into, at, v) => into.Whole(at, v)),
        [typeof(ulong)] = DecoderOf<ulong>((into, at, v) => PutDecimal(into, at, v)),
        [typeof(bool)] = DecoderOf<bool>((into, at, v) => into.Truth(at, v)),
        [typeof(DateTime)] = DecoderOf<DateTime>((into, at, v) => into.Moment(at, v)),
        [typeof(ReadOnlyMemory<char>)] = DecoderOf<ReadOnlyMemory<char>>((into, at, v) => PutText(into, at, v.Span)),
    };

    /// <summary>The decoder of a field; null for nested values and for types that mean nothing in a panel.</summary>
    public static ColumnDecoder? DecoderOf(Field field) =>
        field is DataField { IsArray: false } data ? Decoders.GetValueOrDefault(data.ClrType) : null;

    /// <summary>What a field holds, for messages.</summary>
    public static string KindOf(Field field) =>
        field is DataField { IsArray: false } data ? string.Create(CultureInfo.InvariantCulture, $"values of the type {data.ClrType.Name}") : "nested values";

    /// <summary>Waits for the library, whose interface is asynchronous throughout while a file on disk is not.</summary>
    public static T Wait<T>(Task<T> task) => task.GetAwaiter().GetResult();

    /// <summary>
    /// A required column has to be read as such: the library takes the definition levels of one that is read as nullable from a buffer that
    /// nobody filled, so that cells come out empty at random.
    /// </summary>
    private static ColumnDecoder DecoderOf<T>(Action<CellColumn, CellPlace, T> put)
        where T : struct => (group, field) =>
    {
        if (!field.IsNullable)
        {
            var all = Scratch<T>.Of(checked((int)group.RowCount));
            group.ReadAsync(field, all).AsTask().GetAwaiter().GetResult();
            return (into, places) =>
            {
                var cells = all.Span;
                for (var i = 0; i < cells.Length; i++) put(into, places[i], cells[i]);
            };
        }

        var some = Scratch<T?>.Of(checked((int)group.RowCount));
        group.ReadAsync(field, some).AsTask().GetAwaiter().GetResult();
        return (into, places) =>
        {
            var cells = some.Span;
            for (var i = 0; i < cells.Length; i++)
                if (cells[i] is { } value) put(into, places[i], value);
                else into.Empty(places[i]);
        };
    };

    /// <summary>
    /// The array that the cells of one column of a row group are decoded into, good until the next column of the same kind is. Arrays of this size, made
    /// anew for each column, would pile up faster than the runtime collects them.
    /// </summary>
    private static class Scratch<T>
    {
        [ThreadStatic]
        private static T[]? cells;

        public static Memory<T> Of(int rows)
        {
            if (cells is null || cells.Length < rows) cells = new T[rows];
            // An empty cell is one that the library does not write.
            Array.Clear(cells);
            return cells.AsMemory(0, rows);
        }
    }

    /// <summary>Whole numbers keep all their digits, because ids of twenty digits must not run together.</summary>
    private static void PutDecimal(CellColumn into, CellPlace at, decimal value)
    {
        if (value != decimal.Truncate(value)) into.Number(at, (double)value);
        else if (value is >= long.MinValue and <= long.MaxValue) into.Whole(at, (long)value);
        else PutText(into, at, value.ToString("F0", CultureInfo.InvariantCulture));
    }

    private static void PutText(CellColumn into, CellPlace at, ReadOnlySpan<char> text)
    {
        Span<byte> small = stackalloc byte[256];
        var most = Encoding.UTF8.GetMaxByteCount(text.Length);
        var utf8 = most <= small.Length ? small : new byte[most];
        into.Text(at, utf8[..Encoding.UTF8.GetBytes(text, utf8)]);
    }
}
