using Parquet;
using Parquet.Schema;
using PanelChoice.Data;

namespace PanelChoice.Results;

/// <summary>Writes covariates as a Parquet file: text keys, a whole number or date for the occasion, booleans, doubles.</summary>
internal static class CovariateParquet
{
    private const int RowsOfGroup = 1 << 18;

    public static void Write(CovariateTable table, Stream stream) => WriteAsync(table, stream).GetAwaiter().GetResult();

    private static async Task WriteAsync(CovariateTable table, Stream stream)
    {
        var person = new DataField<string>(CovariateTable.KeyNames[0], nullable: false);
        var occasion = OccasionField(table.Panel.Table.OccasionKind, CovariateTable.KeyNames[1]);
        var alternative = new DataField<string>(CovariateTable.KeyNames[2], nullable: false);
        var chosen = new DataField<bool>(CovariateTable.KeyNames[3]);
        var offered = new DataField<bool>(CovariateTable.KeyNames[4]);
        var covariates = table.Columns.Select(c => new DataField<double>(c)).ToArray();
        var schema = new ParquetSchema([person, .. occasion is null ? Array.Empty<Field>() : [occasion], alternative, chosen, offered, .. covariates]);
        var options = new ParquetOptions { CompressionMethod = CompressionMethod.Snappy };
        var writer = await ParquetWriter.CreateAsync(schema, stream, options).ConfigureAwait(false);
        await using (writer.ConfigureAwait(false))
        {
            for (var first = 0; first < table.Rows; first += RowsOfGroup)
            {
                var start = first;
                var length = Math.Min(RowsOfGroup, table.Rows - start);
                using var group = writer.CreateRowGroup();
                await group.WriteAsync(person, Column(r => table.Person(r))).ConfigureAwait(false);
                if (occasion is DateTimeDataField)
                    await group.WriteAsync<DateTime>(occasion, Column(r => DateOnly.FromDayNumber((int)table.Occasion(r)).ToDateTime(TimeOnly.MinValue, DateTimeKind.Utc)))
                        .ConfigureAwait(false);
                else if (occasion is not null)
                    await group.WriteAsync<long>(occasion, Column(table.Occasion)).ConfigureAwait(false);
                await group.WriteAsync(alternative, Column(r => table.Alternative(r))).ConfigureAwait(false);
                await group.WriteAsync<bool>(chosen, Column(table.IsChosen)).ConfigureAwait(false);
                await group.WriteAsync<bool>(offered, Column(table.IsOffered)).ConfigureAwait(false);
                for (var c = 0; c < covariates.Length; c++)
                {
                    var column = c;
                    await group.WriteAsync<double>(covariates[c], Column(r => table.Value(r, column))).ConfigureAwait(false);
                }

                T[] Column<T>(Func<int, T> value)
                {
                    var cells = new T[length];
                    for (var i = 0; i < length; i++) cells[i] = value(start + i);
                    return cells;
                }
            }
        }
    }

    private static DataField? OccasionField(OccasionKind kind, string name) => kind switch
    {
        OccasionKind.Date => new DateTimeDataField(name, DateTimeFormat.Date),
        OccasionKind.WholeNumber => new DataField<long>(name),
        _ => null,
    };
}
