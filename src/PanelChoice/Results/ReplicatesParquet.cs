using Parquet;
using Parquet.Schema;

namespace PanelChoice.Results;

/// <summary>
/// <c>replicates.parquet</c>: a row per bootstrap replicate (its number from 0, how it ended, its log-likelihood, its Newton decrement:
/// how far from its maximum it may be, in its own pooled standard errors, and what a failure is about) and a column per parameter; figures of a failed replicate are null. Compressed with Snappy.
/// </summary>
public static class ReplicatesParquet
{
    internal static readonly string[] FixedColumns = ["replicate", "status", "log_likelihood", "newton_decrement", "failed_parameters"];

    /// <summary>Writes the table.</summary>
    /// <param name="result">The result.</param>
    /// <param name="stream">Where to; readable and seekable.</param>
    public static void Write(AnalysisResult result, Stream stream)
    {
        ArgumentNullException.ThrowIfNull(result);
        WriteAsync(result.Replicates, stream).GetAwaiter().GetResult();
    }

    private static async Task WriteAsync(ReplicateTable table, Stream stream)
    {
        var number = new DataField<int>(FixedColumns[0]);
        var status = new DataField<string>(FixedColumns[1]);
        var logLikelihood = new DataField<double?>(FixedColumns[2]);
        var decrement = new DataField<double?>(FixedColumns[3]);
        var failed = new DataField<string>(FixedColumns[4]);
        var parameters = table.Labels.Select(l => new DataField<double?>(l)).ToArray();
        var options = new ParquetOptions { CompressionMethod = CompressionMethod.Snappy };
        var writer = await ParquetWriter.CreateAsync(new ParquetSchema([number, status, logLikelihood, decrement, failed, .. parameters]), stream, options).ConfigureAwait(false);
        await using (writer.ConfigureAwait(false))
        {
            if (table.Status.IsEmpty) return;
            using var group = writer.CreateRowGroup();
            await group.WriteAsync<int>(number, Enumerable.Range(0, table.Status.Length).ToArray()).ConfigureAwait(false);
            await group.WriteAsync(status, table.Status).ConfigureAwait(false);
            await group.WriteAsync<double>(logLikelihood, Column(table.LogLikelihood, 0, 1)).ConfigureAwait(false);
            await group.WriteAsync<double>(decrement, Column(table.Decrement, 0, 1)).ConfigureAwait(false);
            await group.WriteAsync(failed, table.FailedParameters).ConfigureAwait(false);
            for (var k = 0; k < parameters.Length; k++)
                await group.WriteAsync<double>(parameters[k], Column(table.Estimates, k, parameters.Length)).ConfigureAwait(false);
        }
    }

    private static double?[] Column(IReadOnlyList<double> values, int first, int step)
    {
        var column = new double?[values.Count / step];
        for (var r = 0; r < column.Length; r++)
        {
            var value = values[(r * step) + first];
            column[r] = double.IsNaN(value) ? null : value;
        }

        return column;
    }
}
