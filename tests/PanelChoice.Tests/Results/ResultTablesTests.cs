using System.Globalization;
using System.Text;
using Parquet;
using PanelChoice.Results;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Results;

/// <summary>The tables beside the result document hold the same numbers.</summary>
public class ResultTablesTests
{
    private static readonly AnalysisResult Result = HandMadeStages.Result(HandMadeStages.Many);

    [Fact]
    public void Coefficients_have_a_row_per_parameter_and_read_back_to_the_same_bits()
    {
        var lines = Csv(Result).TrimEnd('\n').Split('\n');
        Assert.Equal(Result.Parameters.Length + 1, lines.Length);
        var columns = lines[0].Split(',');
        for (var i = 0; i < Result.Parameters.Length; i++)
        {
            var cells = lines[i + 1].Split(',');
            Assert.Equal(columns.Length, cells.Length);
            var p = Result.Parameters[i];
            Assert.Equal(p.Name, cells[0]);
            Assert.Equal(p.Estimate, Number("estimate"));
            Assert.Equal(p.StandardErrors.Cluster, Number("se_cluster"));
            Assert.Equal(p.Intervals.Jackknife!.High, Number("high_jackknife"));
            Assert.Equal(p.PValues.Robust, Number("p_robust"));
            Assert.Equal(p.SeRatio, Number("se_ratio"));
            Assert.Equal("", cells[Array.IndexOf(columns, "se_two_way")]);

            double Number(string column) => double.Parse(cells[Array.IndexOf(columns, column)], CultureInfo.InvariantCulture);
        }
    }

    [Fact]
    public void Names_with_commas_quotes_and_line_ends_are_quoted()
    {
        var odd = Result with { Parameters = [Result.Parameters[0] with { Name = "fare, \"peak\"\nand off" }] };
        Assert.Contains("\n\"fare, \"\"peak\"\"\nand off\",B,coefficient", Csv(odd), StringComparison.Ordinal);
    }

    [Fact]
    public async Task Replicates_have_a_row_each_and_null_where_one_failed()
    {
        var table = Result.Replicates;
        var broken = Result with
        {
            Replicates = table with
            {
                Status = table.Status.SetItem(2, "separated"), LogLikelihood = table.LogLikelihood.SetItem(2, double.NaN),
                Decrement = table.Decrement.SetItem(2, double.NaN),
                Estimates = [.. table.Estimates.Select((x, i) => i / table.Labels.Length == 2 ? double.NaN : x)],
            },
        };
        using var stream = new MemoryStream();
        ReplicatesParquet.Write(broken, stream);
        stream.Position = 0;
        await using var reader = await ParquetReader.CreateAsync(stream);
        Assert.Equal(
            ["replicate", "status", "log_likelihood", "newton_decrement", "failed_parameters", "constant [B]", "constant [C]", "constant [D]", "attribute 1", "attribute 2", "same as last time", "land", "water"],
            reader.Schema.GetDataFields().Select(f => f.Name));
        using var group = reader.OpenRowGroupReader(0);
        var fields = reader.Schema.GetDataFields();
        var likelihood = new double?[19];
        await group.ReadAsync<double>(fields[2], likelihood);
        var habit = new double?[19];
        await group.ReadAsync<double>(fields[10], habit);
        var decrement = new double?[19];
        await group.ReadAsync<double>(fields[3], decrement);
        for (var r = 0; r < 19; r++)
        {
            Assert.Equal(r == 2 ? null : table.LogLikelihood[r], likelihood[r]);
            Assert.Equal(r == 2 ? null : table.Decrement[r], decrement[r]);
            Assert.Equal(r == 2 ? null : table.Estimates[(r * table.Labels.Length) + 5], habit[r]);
        }
    }

    [Fact]
    public async Task Without_bootstrap_the_file_of_replicates_has_its_columns_and_no_row()
    {
        using var stream = new MemoryStream();
        ReplicatesParquet.Write(Result with { Replicates = Result.Replicates with { Status = [], LogLikelihood = [], Estimates = [] } }, stream);
        stream.Position = 0;
        await using var reader = await ParquetReader.CreateAsync(stream);
        Assert.Equal(0, reader.RowGroupCount);
        Assert.Equal(13, reader.Schema.GetDataFields().Length);
    }

    [Fact]
    public void Columns_of_the_same_name_are_told_apart() =>
        Assert.Equal(["status (2)", "a", "a (2)", "a (3)"], ColumnNames.Distinct(["status", "a", "a", "a"], ["status"]).AsEnumerable());

    private static string Csv(AnalysisResult result)
    {
        using var stream = new MemoryStream();
        CoefficientsCsv.Write(result, stream);
        return Encoding.UTF8.GetString(stream.ToArray());
    }
}
