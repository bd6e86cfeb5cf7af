using System.Collections.Immutable;
using System.Diagnostics.CodeAnalysis;
using Parquet;
using Parquet.Schema;
using PanelChoice.Study;

namespace PanelChoice.Data;

/// <summary>Reads a Parquet file row group by row group, and in each only the needed columns. The first record is row 1.</summary>
internal static class ParquetChoiceReader
{
    /// <summary>Reads a file.</summary>
    public static void Read(Stream file, string name, ChoiceColumns columns)
    {
        // Bytes without a logical type are text: some writers leave the mark out.
        var options = new ParquetOptions { TreatByteArrayAsString = true };
        if (!TryRead(() => ParquetDecoding.Wait(ParquetReader.CreateAsync(file, options, true)), name, columns, out var reader)) return;
        if (!TryRead(() => reader.Schema.Fields, name, columns, out var fields)) return;
        var positions = columns.Needed.Locate(name, [.. fields.Select(f => f.Name.Trim())], columns.Problems);
        foreach (var needed in columns.Needed.All)
            if (positions.TryGetValue(needed.Name, out var position) && ParquetDecoding.DecoderOf(fields[position]) is null)
                columns.Problems.Add(new Problem(
                    "data.unsupported_type", name, $"the column holds {ParquetDecoding.KindOf(fields[position])}, of which {needed.AskedBy} can make nothing",
                    "store it as numbers, text, truth values or dates") { Column = needed.Name });

        var rows = 0L;
        for (var g = 0; g < reader.RowGroupCount && columns.Problems.IsEmpty; g++) rows += ReadGroup(reader, g, fields, positions, name, rows, columns);
    }

    /// <summary>Reads a row group and returns how many rows it has.</summary>
    private static long ReadGroup(
        ParquetReader reader, int number, IReadOnlyList<Field> fields, ImmutableDictionary<string, int> positions, string name, long firstRow, ChoiceColumns columns)
    {
        if (!TryRead(() => reader.OpenRowGroupReader(number), name, columns, out var group)) return 0;
        var begin = columns.Rows;
        CellPlace[]? places = null;
        // A column that is read in several ways is decoded once; the offered column stays the first.
        foreach (var readings in columns.Readings.GroupBy(r => r.Source, r => r.Into, StringComparer.Ordinal))
        {
            var field = fields[positions[readings.Key]];
            if (!TryRead(() => ParquetDecoding.DecoderOf(field)!(group, (DataField)field), name, columns, out var fill)) return 0;
            foreach (var into in readings)
            {
                // Rows begin once a column of them could be decoded, because a damaged file may claim any number of rows.
                if (columns.Rows == begin) BeginRows((int)group.RowCount);
                places ??= columns.PlacesFrom(begin);
                fill(into, places);
                // Where the first reading is the offered column, it settles the places of all others.
                if (into == columns.Readings[0].Into) places = null;
            }
        }

        columns.RowsAdded?.Invoke();
        return group.RowCount;

        void BeginRows(int rows)
        {
            columns.Reserve(rows);
            for (var row = 1; row <= rows; row++) columns.BeginRow(firstRow + row);
        }
    }

    /// <summary>
    /// Runs one call of the decoding library. A damaged file can make it fail with almost any exception, so that all become one problem; our
    /// own code stays outside, so that its faults are not mistaken for the file's.
    /// </summary>
    private static bool TryRead<T>(Func<T> read, string name, ChoiceColumns columns, [NotNullWhen(true)] out T? result)
        where T : class
    {
        try
        {
            result = read();
            return true;
        }
        catch (Exception e)
        {
            // Damaged lengths make the library ask for more memory than any machine has, or trip over itself; its words then help nobody.
            var why = e switch
            {
                OutOfMemoryException => "it asks for more memory than there is",
                NullReferenceException or IndexOutOfRangeException or ArgumentException or ArithmeticException or InvalidCastException => "it is damaged",
                _ => e.Message.TrimEnd('.'),
            };
            columns.Problems.Add(new Problem("data.unreadable", name, $"the file cannot be read as Parquet ({why})", "write the file again, or give a .csv file"));
            result = null;
            return false;
        }
    }
}
