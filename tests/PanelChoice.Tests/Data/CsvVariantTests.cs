using System.Globalization;
using System.Security.Cryptography;
using System.Text;
using PanelChoice.Data;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Data;

/// <summary>The ways in which people's programs write the same text file.</summary>
public sealed class CsvVariantTests : IDisposable
{
    private const string Plain = """
        person,day,mode,chosen,time,sky
        P2,2031-03-03,bus,1,12.5,fair
        P2,2031-03-03,car,0,7,fair
        P10,2031-03-04,bus,0,-3e-1,"wind, rain"
        P10,2031-03-04,car,1,.5,"wind, rain"

        """;

    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    private static StudySpecification Study(string path) => StudySketch.Over(path, [.. StudySketch.Numbers("time"), .. StudySketch.Texts("sky")]);

    private ChoiceTable Read(string name, byte[] bytes) => Tables.Read(Study(folder.Write(name, bytes)));

    private ChoiceTable Read(string text) => Read("panel.csv", Encoding.UTF8.GetBytes(text));

    [Fact]
    public void A_plain_file()
    {
        var table = Read(Plain);
        Assert.Equal("panel.csv", table.File);
        Assert.Equal(Convert.ToHexStringLower(SHA256.HashData(Encoding.UTF8.GetBytes(Plain))), table.Sha256);
        Assert.Equal([2L, 3L, 4L, 5L], table.SourceRow.AsEnumerable());
        Assert.Equal(["P10", "P2"], table.Person.Levels.AsEnumerable());
        Assert.Equal([1, 1, 0, 0], table.Person.Codes.AsEnumerable());
        Assert.Equal(OccasionKind.Date, table.OccasionKind);
        Assert.Equal(new DateOnly(2031, 3, 3).DayNumber, table.Occasion[0]);
        Assert.Equal(["bus", "car"], table.Alternative.Levels.AsEnumerable());
        Assert.Equal([true, false, false, true], table.Chosen.AsEnumerable());
        Assert.Equal([true, true, true, true], table.Offered.AsEnumerable());
        Assert.Empty(table.Weight);
        Assert.Equal([12.5, 7, -0.3, 0.5], table.Numbers["time"].AsEnumerable());
        Assert.Equal(["fair", "fair", "wind, rain", "wind, rain"], Tables.Names(table.Texts["sky"]));
    }

    [Theory]
    [InlineData(';')]
    [InlineData('\t')]
    [InlineData('|')]
    public void Other_separators_are_detected(char separator)
    {
        var text = Plain.Replace("\"wind, rain\"", "'#'", StringComparison.Ordinal).Replace(',', separator).Replace("'#'", "\"wind, rain\"", StringComparison.Ordinal);
        Tables.AssertSame(Read(Plain), Read(text));
    }

    [Fact]
    public void A_separator_is_found_although_another_is_more_frequent()
    {
        var rows = string.Concat(Enumerable.Range(1, 40).Select(i => $"{i};1;bus;1;4;a,b,c,d,e,f,g\n"));
        var table = Read("person;day;mode;chosen;time;sky\n" + rows);
        Assert.Equal(40, table.Rows);
        Assert.Equal("a,b,c,d,e,f,g", Assert.Single(table.Texts["sky"].Levels));
    }

    [Fact]
    public void Line_ends_of_two_characters_and_a_last_line_without_one() =>
        Tables.AssertSame(Read(Plain), Read(Plain.TrimEnd().Replace("\n", "\r\n", StringComparison.Ordinal)));

    [Fact]
    public void A_byte_order_mark() => Tables.AssertSame(Read(Plain), Read("panel.csv", [0xEF, 0xBB, 0xBF, .. Encoding.UTF8.GetBytes(Plain)]));

    [Fact]
    public void Utf16_in_either_byte_order()
    {
        var text = Plain.Replace("fair", "žemas", StringComparison.Ordinal);
        Tables.AssertSame(Read(text), Read("panel.csv", [0xFF, 0xFE, .. Encoding.Unicode.GetBytes(text)]));
        Tables.AssertSame(Read(text), Read("panel.csv", [0xFE, 0xFF, .. Encoding.BigEndianUnicode.GetBytes(text)]));
    }

    [Fact]
    public void Gzip_with_the_hash_of_the_bytes_as_stored()
    {
        var packed = TemporaryFolder.Gzip(Encoding.UTF8.GetBytes(Plain));
        var table = Read("panel.csv.gz", packed);
        Tables.AssertSame(Read(Plain), table);
        Assert.Equal(Convert.ToHexStringLower(SHA256.HashData(packed)), table.Sha256);
    }

    [Theory]
    [InlineData("panel.CSV")]
    [InlineData("panel.txt")]
    [InlineData("panel.tsv")]
    public void Other_endings_of_text_files(string name) => Tables.AssertSame(Read(Plain), Read(name, Encoding.UTF8.GetBytes(Plain)));

    [Fact]
    public void Quotes_hold_separators_quotes_and_line_ends()
    {
        var table = Read("person,day,mode,chosen,time,sky\n\"P \"\"1\"\"\",1,bus,1,\"4\",\"two\nlines\"\nP2,1,bus,1,5,fair\n");
        Assert.Equal(["P \"1\"", "P2"], Tables.Names(table.Person));
        Assert.Equal("two\nlines", table.Texts["sky"].Levels[1]);
        Assert.Equal([2L, 3L], table.SourceRow.AsEnumerable());
    }

    [Fact]
    public void Empty_lines_are_passed_over_but_count_as_rows()
    {
        var table = Read("person,day,mode,chosen,time,sky\n\n1,1,bus,1,4,fair\n\n\n2,1,bus,1,4,fair\n\n");
        Assert.Equal([3L, 6L], table.SourceRow.AsEnumerable());
    }

    [Fact]
    public void Blanks_around_cells_and_column_names_do_not_count() =>
        Tables.AssertSame(
            Read("person,day,mode,chosen,time,sky\nP 1,1,bus,1,4.5,fair\n"),
            Read(" person , day,mode\t,chosen,time,sky\n P 1 , 1 ,\tbus, 1, 4.5 , fair \n"));

    [Fact]
    public void Columns_that_nobody_needs_may_hold_anything()
    {
        byte[] bytes = [.. Encoding.UTF8.GetBytes("person,note,note,,day,mode,chosen,time,sky\n1,x"), 0xE9, .. Encoding.UTF8.GetBytes(",,7,1,bus,1,4,fair\n")];
        Assert.Equal([4d], Read("panel.csv", bytes).Numbers["time"].AsEnumerable());
    }

    [Theory]
    [InlineData("1", "0")]
    [InlineData("true", "false")]
    [InlineData("TRUE", "False")]
    [InlineData("1.0", "0.0")]
    public void Yes_and_no_are_written_in_several_ways(string yes, string no)
    {
        var path = folder.Write("panel.csv", $"person,day,mode,chosen,on\n1,1,bus,{yes},{yes}\n1,1,car,{no},{no}\n");
        var table = Tables.Read(StudySketch.Over(path, offered: "on"));
        Assert.Equal([true, false], table.Chosen.AsEnumerable());
        Assert.Equal([true, false], table.Offered.AsEnumerable());
    }

    [Fact]
    public void True_and_false_serve_as_1_and_0_in_a_numeric_column()
    {
        var path = folder.Write("panel.csv", "person,day,mode,chosen,ticket\n1,1,bus,1,true\n1,1,car,0,FALSE\n");
        Assert.Equal([1d, 0d], Tables.Read(StudySketch.Over(path, StudySketch.Numbers("ticket"))).Numbers["ticket"].AsEnumerable());
    }

    [Theory]
    [InlineData("7", 7)]
    [InlineData("-3", -3)]
    [InlineData("007", 7)]
    [InlineData("7.0", 7)]
    [InlineData("20310414", 20310414)]
    public void Whole_numbers_as_occasions(string cell, long occasion)
    {
        var table = Tables.Read(StudySketch.Over(folder.Write("panel.csv", $"person,day,mode,chosen\n1,{cell},bus,1\n")));
        Assert.Equal(OccasionKind.WholeNumber, table.OccasionKind);
        Assert.Equal([occasion], table.Occasion.AsEnumerable());
    }

    [Fact]
    public void Without_an_occasion_column_every_occasion_is_0()
    {
        var table = Tables.Read(StudySketch.Over(folder.Write("panel.csv", "person,mode,chosen\n1,bus,1\n2,bus,1\n"), occasion: null));
        Assert.Equal(OccasionKind.None, table.OccasionKind);
        Assert.Equal([0L, 0L], table.Occasion.AsEnumerable());
    }

    [Fact]
    public void Where_the_alternative_was_not_offered_attributes_may_be_empty()
    {
        var path = folder.Write("panel.csv", "person,day,mode,chosen,on,time,sky,w\n1,1,bus,1,1,4,fair,2\n1,1,car,0,0,,,\n1,1,tram,0,0,NaN,rain,2\n");
        var table = Tables.Read(StudySketch.Over(path, [.. StudySketch.Numbers("time"), .. StudySketch.Texts("sky")], offered: "on", weight: "w"));
        Assert.Equal([4, double.NaN, double.NaN], table.Numbers["time"].AsEnumerable());
        Assert.Equal(["fair", "(none)", "rain"], Tables.Names(table.Texts["sky"]));
        Assert.Equal([2, double.NaN, 2], table.Weight.AsEnumerable());
    }

    [Fact]
    public void A_column_is_read_as_number_and_as_text_where_a_study_needs_both()
    {
        var path = folder.Write("panel.csv", "person,day,mode,chosen\n1,1,bus,1\n2,01,bus,1\n");
        var table = Tables.Read(StudySketch.Over(path, [.. StudySketch.Numbers("day"), .. StudySketch.Texts("day")]));
        Assert.Equal([1L, 1L], table.Occasion.AsEnumerable());
        Assert.Equal([1d, 1d], table.Numbers["day"].AsEnumerable());
        Assert.Equal(["1", "01"], Tables.Names(table.Texts["day"]));
    }

    [Fact]
    public void Numbers_read_the_same_under_every_culture()
    {
        var before = CultureInfo.CurrentCulture;
        var comma = (CultureInfo)CultureInfo.InvariantCulture.Clone();
        comma.NumberFormat.NumberDecimalSeparator = ",";
        comma.NumberFormat.NumberGroupSeparator = ".";
        comma.NumberFormat.NegativeSign = "~";
        try
        {
            CultureInfo.CurrentCulture = comma;
            Assert.Equal([12.5, 7, -0.3, 0.5], Read(Plain).Numbers["time"].AsEnumerable());
        }
        finally
        {
            CultureInfo.CurrentCulture = before;
        }
    }

    [Fact]
    public void Every_number_reads_to_the_last_bit()
    {
        double[] values = [0.1, 1d / 3, Math.PI * 1e300, double.Epsilon, double.MaxValue, -2.2250738585072014e-308, 123456789.123456789, 9007199254740993];
        var rows = string.Concat(values.Select((v, i) => string.Create(CultureInfo.InvariantCulture, $"{i},1,bus,1,{v:R},x\n")));
        Assert.Equal(values, Read("person,day,mode,chosen,time,sky\n" + rows).Numbers["time"].AsEnumerable());
    }

    [Theory]
    [InlineData(".")]
    [InlineData("-")]
    [InlineData("-.")]
    [InlineData("1.2.3")]
    [InlineData("1-2")]
    [InlineData("--1")]
    [InlineData("1_000")]
    public void What_looks_like_a_number_and_is_none(string text) => Assert.False(CellText.TryNumber(Encoding.UTF8.GetBytes(text), out _));
}
