using Parquet;
using Parquet.Schema;
using PanelChoice.Data;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Data;

/// <summary>Parquet columns of every type that a panel can come in.</summary>
public sealed class ParquetVariantTests : IDisposable
{
    private static readonly DateTime Monday = new(2031, 3, 3, 0, 0, 0, DateTimeKind.Utc);

    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    private static ParquetTable Keys() => new ParquetTable().AddText("person", "a", "a", "b", "b").Add("day", 1, 1, 1, 1)
        .AddText("mode", "bus", "car", "bus", "car").Add("chosen", 1, 0, 0, 1).Add("on", true, true, true, false);

    private ChoiceTable Read(ParquetTable table, params string[] numbers) => Tables.Read(Study(table, numbers));

    private StudySpecification Study(ParquetTable table, params string[] numbers) =>
        StudySketch.Over(table.WriteTo(folder.PathOf("panel.parquet"), rowsPerGroup: 2), StudySketch.Numbers(numbers), offered: "on");

    private Problem OnlyProblem(ParquetTable table, params string[] numbers) => Assert.Single(ChoiceTableReader.Read(Study(table, numbers)).Problems);

    [Fact]
    public void Numeric_columns_of_every_type()
    {
        var table = Keys()
            .Add("double", 1.5, -2, 3, 4).Add("float", 1.5f, -2f, 3f, 4f).Add("long", 1L, -2L, 3L, 4L).Add("int", 1, -2, 3, 4).Add<short>("short", 1, -2, 3, 4)
            .Add<sbyte>("sbyte", 1, -2, 3, 4).Add<byte>("byte", 1, 2, 3, 4).Add<ushort>("ushort", 1, 2, 3, 4).Add<uint>("uint", 1, 2, 3, 4)
            .Add<ulong>("ulong", 1, 2, 3, 4).Add("bool", true, false, true, false).Add(new DecimalDataField("decimal", 12, 3), 1.5m, -2m, 3m, 4.125m)
            .AddText("text", "1.5", "-2", " 3 ", "4e0");
        string[] names = ["double", "float", "long", "int", "short", "sbyte", "byte", "ushort", "uint", "ulong", "bool", "decimal", "text"];
        var read = Read(table, names);
        foreach (var name in names)
        {
            double[] expected = name switch
            {
                "double" or "float" or "text" => [1.5, -2, 3, 4],
                "decimal" => [1.5, -2, 3, 4.125],
                "bool" => [1, 0, 1, 0],
                "byte" or "ushort" or "uint" or "ulong" => [1, 2, 3, 4],
                _ => [1, -2, 3, 4],
            };
            Assert.Equal(expected, read.Numbers[name].AsEnumerable());
        }

        Assert.Equal([1L, 2L, 3L, 4L], read.SourceRow.AsEnumerable());
    }

    [Fact]
    public void Empty_cells_are_accepted_where_the_alternative_was_not_offered()
    {
        var table = Keys().AddNullable<double>("double", 1, 2, 3, null).AddNullable<int>("int", 1, 2, 3, null).Add("nan", 1, 2, 3, double.NaN)
            .AddNullable<bool>("bool", true, false, true, null).AddNullable(new DecimalDataField("decimal", 12, 3, false, true), 1m, 2m, 3m, (decimal?)null).AddText("text", "1", "2", "3", null);
        string[] names = ["double", "int", "nan", "decimal", "text"];
        var read = Read(table, [.. names, "bool"]);
        foreach (var name in names) Assert.Equal([1, 2, 3, double.NaN], read.Numbers[name].AsEnumerable());
        Assert.Equal([1, 0, 1, double.NaN], read.Numbers["bool"].AsEnumerable());
    }

    [Fact]
    public void An_empty_cell_on_an_offered_row()
    {
        var problem = OnlyProblem(Keys().AddNullable<double>("time", 1, 2, null, 4), "time");
        Assert.Equal(("data.empty_cell", 3L, "time"), (problem.Id, problem.Row, problem.Column));
    }

    [Fact]
    public void A_number_that_is_not_finite()
    {
        var problem = OnlyProblem(Keys().Add("time", 1, 2, 3, double.PositiveInfinity), "time");
        Assert.Equal(("data.not_finite", 4L, "time", "Infinity"), (problem.Id, problem.Row, problem.Column, problem.Value));
    }

    [Fact]
    public void Text_or_a_date_where_a_number_belongs()
    {
        var text = OnlyProblem(Keys().AddText("time", "1", "soon", "3", "4"), "time");
        Assert.Equal(("data.not_a_number", 2L, "time", "soon"), (text.Id, text.Row, text.Column, text.Value));
        var date = ChoiceTableReader.Read(Study(Keys().Add(new DateTimeDataField("time", DateTimeFormat.Date), Monday, Monday, Monday, Monday), "time")).Problems;
        Assert.Equal([1L, 2L, 3L, 4L], date.Select(p => p.Row!.Value));
        Assert.All(date, p => Assert.Equal(("data.not_a_number", "2031-03-03"), (p.Id, p.Value)));
    }

    [Fact]
    public void Nested_values_and_types_without_a_meaning_here()
    {
        var problem = OnlyProblem(Keys().Add("time", Guid.NewGuid(), Guid.NewGuid(), Guid.NewGuid(), Guid.NewGuid()), "time");
        Assert.Equal(("data.unsupported_type", "time"), (problem.Id, problem.Column));
        Assert.Contains("values of the type Guid", problem.Sentence, StringComparison.Ordinal);
        Assert.Null(ParquetDecoding.DecoderOf(new ListField("time", new DataField<int>("item"))));
        Assert.Equal("nested values", ParquetDecoding.KindOf(new ListField("time", new DataField<int>("item"))));
    }

    [Fact]
    public void Ids_that_are_numbers_are_named_as_people_write_them()
    {
        string[] Persons(ParquetTable person) => Tables.Names(Read(person.Add("day", 1, 1, 1, 1).AddText("mode", "bus", "car", "bus", "car")
            .Add("chosen", true, false, true, false).Add("on", true, true, true, true)).Person);
        string[] expected = ["3", "3", "12", "12"];
        Assert.Equal(expected, Persons(new ParquetTable().Add("person", 3d, 3d, 12d, 12d)));
        Assert.Equal(expected, Persons(new ParquetTable().Add("person", 3L, 3L, 12L, 12L)));
        Assert.Equal(expected, Persons(new ParquetTable().Add(new DecimalDataField("person", 12, 2), 3m, 3m, 12m, 12m)));
        Assert.Equal(["3.5", "3.5", "9007199254740993", "-1"], Persons(new ParquetTable().AddText("person", "3.5", " 3.5", "9007199254740993", "-1")));
        Assert.Equal(["9007199254740993", "-1", "0", "0"], Persons(new ParquetTable().Add("person", 9007199254740993L, -1L, 0L, 0L)));
        Assert.Equal(["18446744073709551615", "1", "2", "2"], Persons(new ParquetTable().Add<ulong>("person", ulong.MaxValue, 1, 2, 2)));
    }

    [Theory]
    [InlineData(DateTimeFormat.Date)]
    [InlineData(DateTimeFormat.DateAndTime)]
    [InlineData(DateTimeFormat.DateAndTimeMicros)]
    [InlineData(DateTimeFormat.Impala)]
    public void Dates_and_timestamps_at_midnight_are_dates(DateTimeFormat format)
    {
        var read = Read(WithDays(t => t.Add(new DateTimeDataField("day", format), Monday, Monday, Monday.AddDays(1), Monday.AddDays(1))));
        Assert.Equal(OccasionKind.Date, read.OccasionKind);
        var day = new DateOnly(2031, 3, 3).DayNumber;
        Assert.Equal([day, day, day + 1, day + 1], read.Occasion.AsEnumerable());
    }

    [Fact]
    public void A_timestamp_with_a_time_of_day()
    {
        var problem = OnlyProblem(WithDays(t => t.Add(new DateTimeDataField("day", DateTimeFormat.DateAndTime), Monday, Monday, Monday, Monday.AddHours(8))));
        Assert.Equal(("data.occasion_not_date_or_whole", 4L, "day", "2031-03-03T08:00:00"), (problem.Id, problem.Row, problem.Column, problem.Value));
        Assert.Contains("is a date with a time of day", problem.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Whole_numbers_in_a_floating_point_column_are_occasions_and_fractions_are_not()
    {
        Assert.Equal([1L, 1L, 2L, 2L], Read(WithDays(t => t.Add("day", 1d, 1d, 2d, 2d))).Occasion.AsEnumerable());
        var problem = OnlyProblem(WithDays(t => t.Add("day", 1d, 1d, 2d, 2.5)));
        Assert.Equal(("data.occasion_not_date_or_whole", 4L, "2.5"), (problem.Id, problem.Row, problem.Value));
        var empty = OnlyProblem(WithDays(t => t.Add("day", 1d, 1d, 2d, double.NaN)));
        Assert.Equal(("data.empty_cell", 4L), (empty.Id, empty.Row));
    }

    [Fact]
    public void Columns_that_nobody_needs_are_not_decoded()
    {
        var table = Keys().Add("unused", Guid.NewGuid(), Guid.NewGuid(), Guid.NewGuid(), Guid.NewGuid());
        Assert.Empty(Read(table).Numbers);
    }

    [Fact]
    public void A_missing_column_and_one_that_cannot_be_used_are_told_together()
    {
        var table = Keys().Add("time", Guid.NewGuid(), Guid.NewGuid(), Guid.NewGuid(), Guid.NewGuid());
        var problems = ChoiceTableReader.Read(Study(table, "time", "fare")).Problems;
        Assert.Equal([("data.missing_column", "fare"), ("data.unsupported_type", "time")], problems.Select(p => (p.Id, p.Column!)).Order());
    }

    [Theory]
    [InlineData(CompressionMethod.None)]
    [InlineData(CompressionMethod.Snappy)]
    [InlineData(CompressionMethod.Gzip)]
    public void Compressed_files_with_dictionaries(CompressionMethod compression)
    {
        var many = Enumerable.Range(0, 3000).ToArray();
        var table = new ParquetTable().AddText("person", [.. many.Select(i => $"P{i / 100}")]).Add("day", [.. many.Select(i => i % 100)])
            .AddText("mode", [.. many.Select(_ => "bus")]).Add("chosen", [.. many.Select(_ => 1)]).Add("time", [.. many.Select(i => i % 7 * 0.5)]);
        var options = new ParquetOptions { CompressionMethod = compression, DictionaryEncodingThreshold = 0.9 };
        var read = Tables.Read(StudySketch.Over(table.WriteTo(folder.PathOf("panel.parquet"), 700, options), StudySketch.Numbers("time")));
        Assert.Equal(many.Select(i => $"P{i / 100}"), Tables.Names(read.Person));
        Assert.Equal(many.Select(i => i % 7 * 0.5), read.Numbers["time"].AsEnumerable());
        Assert.Equal(many.Select(i => i + 1L), read.SourceRow.AsEnumerable());
    }

    [Fact]
    public void Bad_cells_of_several_columns_come_in_the_order_of_rows()
    {
        var table = Keys().AddText("time", "1", "x", "3", "x").AddText("fare", "y", "2", "y", "4");
        Assert.Equal(
            [(1L, "fare"), (2L, "time"), (3L, "fare"), (4L, "time")],
            ChoiceTableReader.Read(Study(table, "time", "fare")).Problems.Select(p => (p.Row!.Value, p.Column!)).Take(4));
    }

    private static ParquetTable WithDays(Func<ParquetTable, ParquetTable> day) => day(new ParquetTable().AddText("person", "a", "a", "b", "b"))
        .AddText("mode", "bus", "car", "bus", "car").Add("chosen", 1, 0, 0, 1).Add("on", true, true, true, true);
}
