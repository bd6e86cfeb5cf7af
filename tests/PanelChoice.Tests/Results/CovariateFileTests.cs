using System.Globalization;
using Parquet;
using Parquet.Schema;
using PanelChoice.Covariates;
using PanelChoice.Panels;
using PanelChoice.Results;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Results;

public sealed class CovariateFileTests : IDisposable
{
    private const string Dates = """
        bo,b 2031-03-06 tram delay=0.1,2,3
        bo,b 2031-03-07 bus delay=4,5,6e-300
        ann 2031-03-06 bus delay=1,2,3
        ann 2031-03-07 tram delay=0.30000000000000004,-5,9 rows=bus,tram
        ann 2031-03-10 bus delay=7,8,12345678.9012345 offered=bus,tram
        """;

    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    [Fact]
    public void Csv_holds_the_sample_row_by_row_with_every_digit()
    {
        var path = folder.PathOf("covariates.csv");
        CovariateFile.Write(Built(Dates, PreviousRule.Workday), path);
        Assert.Equal(
            """
            person,occasion,alternative,chosen,offered,constant [ferry],constant [tram],delay,last
            ann,2031-03-07,bus,0,1,0,0,0.30000000000000004,1
            ann,2031-03-07,tram,1,1,0,1,9,0
            ann,2031-03-10,bus,1,1,0,0,7,0
            ann,2031-03-10,ferry,0,0,0,0,0,0
            ann,2031-03-10,tram,0,1,0,1,12345678.9012345,1
            "bo,b",2031-03-07,bus,1,1,0,0,4,0
            "bo,b",2031-03-07,ferry,0,1,1,0,5,0
            "bo,b",2031-03-07,tram,0,1,0,1,6E-300,1

            """.ReplaceLineEndings("\n"),
            File.ReadAllText(path));
        Assert.NotEqual(0xEF, File.ReadAllBytes(path)[0]);
    }

    [Theory]
    [InlineData("C")]
    [InlineData("comma")]
    public void Csv_is_the_same_in_every_culture(string culture)
    {
        var before = CultureInfo.CurrentCulture;
        var comma = (CultureInfo)CultureInfo.InvariantCulture.Clone();
        comma.NumberFormat.NumberDecimalSeparator = ",";
        try
        {
            CultureInfo.CurrentCulture = culture == "C" ? before : comma;
            var path = folder.PathOf("covariates.csv");
            CovariateFile.Write(Built(Dates, PreviousRule.Workday), path);
            Assert.Contains("0.30000000000000004", File.ReadAllText(path), StringComparison.Ordinal);
        }
        finally
        {
            CultureInfo.CurrentCulture = before;
        }
    }

    [Theory]
    [InlineData(true)]
    [InlineData(false)]
    public async Task Parquet_reads_back_as_the_csv_file_says(bool dates)
    {
        var set = dates ? Built(Dates, PreviousRule.Workday) : Built("ann -1 bus delay=1,2,3\nann 0 tram delay=3,4,5\nann 1 tram delay=3.25,4,5", PreviousRule.Step);
        var (parquet, csv) = (folder.PathOf("covariates.parquet"), folder.PathOf("covariates.csv"));
        CovariateFile.Write(set, parquet);
        CovariateFile.Write(set, csv);
        await using var reader = await ParquetReader.CreateAsync(parquet);
        using var group = reader.OpenRowGroupReader(0);
        var rows = (int)group.RowCount;
        var columns = new List<string[]>();
        foreach (var field in reader.Schema.DataFields)
            columns.Add([field.Name, .. await Texts(group, field, rows)]);
        var lines = Enumerable.Range(0, rows + 1).Select(r => string.Join(',', columns.Select(c => c[r].Contains(',', StringComparison.Ordinal) ? $"\"{c[r]}\"" : c[r])) + "\n");
        Assert.Equal(File.ReadAllText(csv), string.Concat(lines));
    }

    [Fact]
    public void A_term_called_like_a_key_gets_a_column_of_its_own()
    {
        var panel = Diary.Panel("bus ferry tram", "ann 1 bus delay=1,2,3");
        var set = Set(panel, Studies.History(null), Studies.Column("delay") with { Name = "chosen" });
        var path = folder.PathOf("covariates.csv");
        CovariateFile.Write(set, path);
        Assert.Equal("person,occasion,alternative,chosen,offered,chosen (2)", File.ReadLines(path).First());
    }

    [Fact]
    public void Only_csv_and_parquet_can_be_written()
    {
        Assert.True(CovariateFile.CanWrite("a.CSV"));
        Assert.False(CovariateFile.CanWrite("a.txt"));
        Assert.Throws<ArgumentException>(() => CovariateFile.Write(Built(Dates, PreviousRule.Workday), folder.PathOf("a.txt")));
    }

    private static async Task<string[]> Texts(ParquetRowGroupReader group, DataField field, int rows)
    {
        if (field.ClrType == typeof(ReadOnlyMemory<char>))
        {
            var texts = new string?[rows];
            await group.ReadAsync(field, texts.AsMemory());
            return [.. texts.Select(t => t!)];
        }

        return field.ClrType == typeof(double) ? await Values<double>(v => v.ToString("R", CultureInfo.InvariantCulture))
            : field.ClrType == typeof(bool) ? await Values<bool>(v => v ? "1" : "0")
            : field.ClrType == typeof(DateTime) ? await Values<DateTime>(v => v.ToString("yyyy-MM-dd", CultureInfo.InvariantCulture))
            : await Values<long>(v => v.ToString(CultureInfo.InvariantCulture));

        async Task<string[]> Values<T>(Func<T, string> text)
            where T : struct
        {
            var values = new T[rows];
            await group.ReadAsync<T>(field, values.AsMemory());
            return [.. values.Select(text)];
        }
    }

    private static CovariateSet Built(string lines, PreviousRule rule) => Set(
        Diary.Panel("bus ferry tram", lines), Studies.History(rule),
        Studies.Term("constant", new ConstantSource()).Each("bus"), Studies.Column("delay"), Studies.Term("last", new LastChoiceSource(1)));

    private static CovariateSet Set(ChoicePanel panel, HistorySpecification history, params TermSpecification[] terms)
    {
        var study = Studies.With(history, terms);
        return CovariateBuilder.Build(study, panel, SyntheticPanel.TreeOf(panel.Alternatives, [])).Value!;
    }
}
