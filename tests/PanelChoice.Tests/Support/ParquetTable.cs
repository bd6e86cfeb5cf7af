using Parquet;
using Parquet.Schema;

namespace PanelChoice.Tests.Support;

/// <summary>Writes Parquet files column by column, in row groups of a given length.</summary>
internal sealed class ParquetTable
{
    private readonly List<(DataField Field, Func<ParquetRowGroupWriter, DataField, Range, Task> Write, int Length)> columns = [];

    public ParquetTable Add<T>(string name, params T[] values)
        where T : struct => Add(new DataField<T>(name), values);

    public ParquetTable Add<T>(DataField field, params T[] values)
        where T : struct
    {
        columns.Add((field, (group, f, range) => group.WriteAsync(f, new ReadOnlyMemory<T>(values[range])), values.Length));
        return this;
    }

    public ParquetTable AddNullable<T>(string name, params T?[] values)
        where T : struct => AddNullable(new DataField<T?>(name), values);

    public ParquetTable AddNullable<T>(DataField field, params T?[] values)
        where T : struct
    {
        columns.Add((field, (group, f, range) => group.WriteAsync(f, new ReadOnlyMemory<T?>(values[range])), values.Length));
        return this;
    }

    public ParquetTable AddText(string name, params string?[] values)
    {
        columns.Add((new DataField<string>(name), (group, f, range) => group.WriteAsync(f, values[range]!), values.Length));
        return this;
    }

    public string WriteTo(string path, int rowsPerGroup = int.MaxValue, ParquetOptions? options = null)
    {
        WriteAsync(path, rowsPerGroup, options).GetAwaiter().GetResult();
        return path;
    }

    private async Task WriteAsync(string path, int rowsPerGroup, ParquetOptions? options)
    {
        var schema = new ParquetSchema([.. columns.Select(c => c.Field)]);
        await using var file = File.Create(path);
        await using var writer = await ParquetWriter.CreateAsync(schema, file, options);
        var rows = columns[0].Length;
        for (var from = 0; from < rows; from += Math.Min(rowsPerGroup, rows))
        {
            using var group = writer.CreateRowGroup();
            var range = from..Math.Min(rows, from + Math.Min(rowsPerGroup, rows));
            for (var c = 0; c < columns.Count; c++) await columns[c].Write(group, (DataField)schema.Fields[c], range);
        }
    }
}
