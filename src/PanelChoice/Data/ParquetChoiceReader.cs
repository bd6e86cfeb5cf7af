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
        var places = columns.Needed.Locate(name, [.. fields.Select(f => f.Name.Trim())], columns.Problems);
        foreach (var needed in columns.Needed.All)
            if (places.TryGetValue(needed.Name, out var place) && ParquetDecoding.DecoderOf(fields[place]) is null)
                columns.Problems.Add(new Problem(
                    "data.unsupported_type", name, $"the column holds {ParquetDecoding.KindOf(fields[place])}, of which {needed.AskedBy} can make nothing",
                    "store it as numbers, text, truth values or dates") { Column = needed.Name });

        for (var g = 0; g < reader.RowGroupCount && columns.Problems.IsEmpty; g++) ReadGroup(reader, g, fields, places, name, columns);
    }

    private static void ReadGroup(
        ParquetReader reader, int number, IReadOnlyList<Field> fields, ImmutableDictionary<string, int> places, string name, ChoiceColumns columns)
    {
        if (!TryRead(() => reader.OpenRowGroupReader(number), name, columns, out var group)) return;
        var begin = columns.Rows;
        var rows = group.RowCount;
        // A column that is read in several ways is decoded once; the offered column stays the first.
        foreach (var readings in columns.Readings.GroupBy(r => r.Source, r => r.Into, StringComparer.Ordinal))
        {
            var field = fields[places[readings.Key]];
            if (!TryRead(() => ParquetDecoding.DecoderOf(field)!(group, (DataField)field), name, columns, out var put)) return;
            // Rows begin once a column of them could be decoded, because a damaged file may claim any number of rows.
            while (columns.Rows < begin + rows) columns.BeginRow(columns.Rows + 1);
            foreach (var into in readings)
                for (var i = 0; i < rows; i++) put(into, columns.PlaceOf(begin + i), i);
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
        catch (Exception e) when (e is not OutOfMemoryException)
        {
            columns.Problems.Add(new Problem(
                "data.unreadable", name, $"the file cannot be read as Parquet ({e.Message.TrimEnd('.')})", "write the file again, or give a .csv file"));
            result = null;
            return false;
        }
    }
}
