using PanelChoice.Data;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Data;

/// <summary>Every kind of bad cell: its id, row, column and value, and one clear line that says what to do.</summary>
public sealed class BadCellTests : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    private Problem OnlyProblem(string text, Func<string, StudySpecification> study)
    {
        var problem = Assert.Single(ChoiceTableReader.Read(study(folder.Write("panel.csv", text))).Problems);
        Assert.DoesNotContain('\n', problem.Sentence);
        Assert.StartsWith("panel.csv", problem.Sentence, StringComparison.Ordinal);
        Assert.Matches("[.?]$", problem.Sentence);
        return problem;
    }

    private static void Expect(Problem problem, string id, long? row, string? column, string? value, string sentence)
    {
        Assert.Equal((id, row, column, value), (problem.Id, problem.Row, problem.Column, problem.Value));
        Assert.Equal(sentence, problem.Sentence);
    }

    [Theory]
    [InlineData("abc")]
    [InlineData("NA")]
    [InlineData("1 000")]
    [InlineData("12,5x")]
    [InlineData("0x10")]
    public void Text_in_a_numeric_column(string value) => Expect(
        OnlyProblem($"person,day,mode,chosen,time\n1,1,bus,1,3\n1,1,car,0,\"{value}\"\n", p => StudySketch.Over(p, StudySketch.Numbers("time"))),
        "data.not_a_number", 3, "time", value,
        $"panel.csv, row 3, column 'time', value '{value}': is not a number; write a plain number with a decimal point, as in 12.5; what is unknown cannot be used.");

    [Fact]
    public void A_name_that_goes_on_and_on_is_shown_in_part()
    {
        var problem = OnlyProblem($"person,day,mode,chosen\n1,1,bus,1\n1,1,{new string('x', 201)},0\n", p => StudySketch.Over(p));
        Expect(
            problem, "data.too_long", 3, "mode", new string('x', 60) + "...",
            $"panel.csv, row 3, column 'mode', value '{new string('x', 60)}...': is longer than a name can be, 200 characters; "
            + "name another column, shorten the values, or look for a quote that is closed too late.");
    }

    [Theory]
    [InlineData("9223372036854775807")]
    [InlineData("-9223372036854775808")]
    [InlineData("4611686018427387905")]
    public void An_occasion_too_far_from_0_for_distances(string value) =>
        Assert.Equal(
            ("data.occasion_out_of_range", (long?)3, value),
            OnlyProblem($"person,day,mode,chosen\n1,1,bus,1\n1,{value},bus,1\n", p => StudySketch.Over(p)) is var p ? (p.Id, p.Row, p.Value) : default);

    [Theory]
    [InlineData("12,5")]
    [InlineData("-0,25")]
    [InlineData("1.234,5")]
    public void A_decimal_comma_in_a_semicolon_file(string value) => Expect(
        OnlyProblem($"person;day;mode;chosen;time\n1;1;bus;1;3\n1;1;car;0;{value}\n", p => StudySketch.Over(p, StudySketch.Numbers("time"))),
        "data.not_a_number", 3, "time", value,
        $"panel.csv, row 3, column 'time', value '{value}': is written with a decimal comma; write numbers with a decimal point, as in 12.5.");

    [Theory]
    [InlineData("Infinity")]
    [InlineData("-Infinity")]
    [InlineData("NaN")]
    [InlineData("1e999")]
    public void A_number_that_is_not_finite(string value) => Expect(
        OnlyProblem($"person,day,mode,chosen,time\n1,1,bus,1,{value}\n", p => StudySketch.Over(p, StudySketch.Numbers("time"))),
        "data.not_finite", 2, "time", value,
        $"panel.csv, row 2, column 'time', value '{value}': is not a finite number; give the number; a cell may be empty only where the alternative was not offered.");

    [Theory]
    [InlineData("")]
    [InlineData("  ")]
    [InlineData("\"\"")]
    public void An_empty_number_on_an_offered_row(string cell) => Expect(
        OnlyProblem($"person,day,mode,chosen,time\n1,1,bus,1,{cell}\n", p => StudySketch.Over(p, StudySketch.Numbers("time"))),
        "data.empty_cell", 2, "time", null,
        "panel.csv, row 2, column 'time': the cell is empty; give the number; a cell may be empty only where the alternative was not offered.");

    [Fact]
    public void An_infinite_number_even_where_the_alternative_was_not_offered()
    {
        var problem = OnlyProblem(
            "person,day,mode,chosen,on,time\n1,1,bus,1,1,4\n1,1,car,0,0,Infinity\n", p => StudySketch.Over(p, StudySketch.Numbers("time"), offered: "on"));
        Assert.Equal(("data.not_finite", 3L), (problem.Id, problem.Row));
    }

    [Fact]
    public void An_empty_text_on_an_offered_row() => Expect(
        OnlyProblem("person,day,mode,chosen,sky\n1,1,bus,1,\n", p => StudySketch.Over(p, StudySketch.Texts("sky"))),
        "data.empty_cell", 2, "sky", null,
        "panel.csv, row 2, column 'sky': the cell is empty; give the value; a cell may be empty only where the alternative was not offered.");

    [Theory]
    [InlineData(",1,bus,1", "person")]
    [InlineData("1,1,,1", "mode")]
    public void An_empty_id(string row, string column) => Expect(
        OnlyProblem($"person,day,mode,chosen\n1,1,car,0\n{row}\n", p => StudySketch.Over(p)),
        "data.empty_cell", 3, column, null, $"panel.csv, row 3, column '{column}': the cell is empty; every row needs a value here.");

    [Fact]
    public void An_empty_occasion() => Expect(
        OnlyProblem("person,day,mode,chosen\n1,,car,1\n", p => StudySketch.Over(p)),
        "data.empty_cell", 2, "day", null,
        "panel.csv, row 2, column 'day': the cell is empty; write every occasion as a whole number, or every one as a date like 2031-04-14.");

    [Theory]
    [InlineData("2")]
    [InlineData("yes")]
    [InlineData("0.5")]
    [InlineData("-1")]
    public void Neither_yes_nor_no(string value) => Expect(
        OnlyProblem($"person,day,mode,chosen\n1,1,car,{value}\n", p => StudySketch.Over(p)),
        "data.not_boolean", 2, "chosen", value,
        $"panel.csv, row 2, column 'chosen', value '{value}': says neither yes nor no; write 1 or true, 0 or false.");

    [Theory]
    [InlineData("14.04.2031")]
    [InlineData("04/14/2031")]
    [InlineData("2031-02-29")]
    [InlineData("2031-13-01")]
    [InlineData("2031-4-1")]
    [InlineData("2031-04-14T08:00")]
    [InlineData("1.5")]
    [InlineData("Monday")]
    [InlineData("99999999999999999999")]
    public void An_occasion_that_is_neither_a_whole_number_nor_a_date(string value) => Expect(
        OnlyProblem($"person,day,mode,chosen\n1,{value},car,1\n", p => StudySketch.Over(p)),
        "data.occasion_not_date_or_whole", 2, "day", value,
        $"panel.csv, row 2, column 'day', value '{value}': is neither a whole number nor a date like 2031-04-14; write every occasion as a whole number, or every one as a date like 2031-04-14.");

    [Fact]
    public void Whole_numbers_among_dates() => Expect(
        OnlyProblem("person,day,mode,chosen\n1,2031-04-14,car,1\n1,7,car,1\n", p => StudySketch.Over(p)),
        "data.mixed_occasions", 3, "day", "7",
        "panel.csv, row 3, column 'day', value '7': is a whole number where the rows above hold dates; write every occasion as a whole number, or every one as a date like 2031-04-14.");

    [Fact]
    public void Dates_among_whole_numbers() => Expect(
        OnlyProblem("person,day,mode,chosen\n1,7,car,1\n1,2031-04-14,car,1\n", p => StudySketch.Over(p)),
        "data.mixed_occasions", 3, "day", "2031-04-14",
        "panel.csv, row 3, column 'day', value '2031-04-14': is a date where the rows above hold whole numbers; write every occasion as a whole number, or every one as a date like 2031-04-14.");

    [Fact]
    public void Bytes_that_are_not_utf8()
    {
        byte[] latin = [.. "person,day,mode,chosen\n1,1,m"u8, 0xE9, .. "tro,1\n"u8];
        var problem = Assert.Single(ChoiceTableReader.Read(StudySketch.Over(folder.Write("panel.csv", latin))).Problems);
        Expect(problem, "data.not_utf8", 2, "mode", "m\uFFFDtro", "panel.csv, row 2, column 'mode', value 'm\uFFFDtro': holds bytes that are not UTF-8 text; save the file as UTF-8.");
    }

    [Fact]
    public void A_long_value_is_shortened_in_the_message()
    {
        var problem = OnlyProblem($"person,day,mode,chosen,time\n1,1,bus,1,{new string('x', 500)}\n", p => StudySketch.Over(p, StudySketch.Numbers("time")));
        Assert.Equal(new string('x', 60) + "...", problem.Value);
    }

    [Fact]
    public void A_missing_column_with_the_name_that_was_probably_meant() => Expect(
        OnlyProblem("person,day,mode,chosen,time\n1,1,bus,1,4\n", p => StudySketch.Over(p, StudySketch.Numbers("tiem"))),
        "data.missing_column", null, "tiem", null,
        "panel.csv, column 'tiem': there is no such column, but term 'tiem' (line 20 of study.toml) asks for it; did you mean 'time'?");

    [Fact]
    public void Every_missing_column_is_named_with_the_key_that_asks_for_it()
    {
        var path = folder.Write("panel.csv", "who,mode,chosen\n1,bus,1\n");
        var study = StudySketch.Over(path, [StudySketch.Term("speed", new ConstantSource()) with { Times = "wind" }], weight: "expansion", cluster: "household");
        var problems = ChoiceTableReader.Read(study).Problems;
        Assert.All(problems, p => Assert.Equal("data.missing_column", p.Id));
        Assert.Equal(["person", "day", "expansion", "wind", "household"], problems.Select(p => p.Column));
        Assert.Contains("[panel] person asks for it", problems[0].Sentence, StringComparison.Ordinal);
        Assert.Contains("term 'speed' (line 20 of study.toml) asks for it", problems[3].Sentence, StringComparison.Ordinal);
        Assert.Contains("[inference] cluster asks for it", problems[4].Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_needed_column_name_that_stands_twice() => Expect(
        OnlyProblem("person,day,mode,chosen,mode\n1,1,bus,1,car\n", p => StudySketch.Over(p)),
        "data.duplicate_column", null, "mode", null,
        "panel.csv, column 'mode': 2 columns have this name, which [panel] alternative asks for; give each column its own name.");

    [Theory]
    [InlineData("1,1,bus", "the row has 3 cells where the header has 4")]
    [InlineData("1,1,bus,1,7", "the row has 5 cells where the header has 4")]
    [InlineData("1", "the row has 1 cell where the header has 4")]
    public void A_row_of_another_length(string row, string what) => Expect(
        OnlyProblem($"person,day,mode,chosen\n1,1,car,0\n{row}\n", p => StudySketch.Over(p)),
        "data.ragged_row", 3, null, null, $"panel.csv, row 3: {what}; give every row a cell for each column, and quote text that holds the separator.");

    [Fact]
    public void A_quote_that_is_never_closed() => Expect(
        OnlyProblem("person,day,mode,chosen\n1,1,car,0\n1,1,\"bus,1\n1,2,car,1\n", p => StudySketch.Over(p)),
        "data.bad_quotes", 3, null, null, "panel.csv, row 3: a quote is opened in this row and never closed; close it, or write a quote inside text twice.");

    [Theory]
    [InlineData("b\"us")]
    [InlineData("\"bu\"s")]
    public void A_quote_in_the_middle_of_a_cell(string cell) => Expect(
        OnlyProblem($"person,day,mode,chosen\n1,1,{cell},1\n", p => StudySketch.Over(p)),
        "data.bad_quotes", 2, null, null,
        "panel.csv, row 2: a quote stands in the middle of a cell; put the whole cell in quotes and write the quote inside it twice.");

    [Fact]
    public void Twenty_bad_cells_are_listed_in_the_order_of_rows_and_the_total_is_said()
    {
        var rows = string.Concat(Enumerable.Range(1, 5000).Select(i => $"{i},1,bus,1,x,y\n"));
        var path = folder.Write("panel.csv", "person,day,mode,chosen,time,fare\n" + rows);
        var problems = ChoiceTableReader.Read(StudySketch.Over(path, StudySketch.Numbers("time", "fare"))).Problems;
        Assert.Equal(21, problems.Length);
        Assert.Equal([(2L, "time"), (2L, "fare"), (3L, "time")], problems.Take(3).Select(p => (p.Row!.Value, p.Column!)));
        Assert.Equal(10000, problems[20].Total);
    }

    [Fact]
    public void Problems_of_several_kinds_are_reported_together()
    {
        var path = folder.Write("panel.csv", "person,day,mode,chosen,time\n,1,bus,1,4\n1,x,bus,1,4\n1,1,bus,maybe,4\n1,1,bus,1,y\n1,1\n");
        var problems = ChoiceTableReader.Read(StudySketch.Over(path, StudySketch.Numbers("time"))).Problems;
        Assert.Equal(
            [("data.empty_cell", 2L), ("data.occasion_not_date_or_whole", 3L), ("data.not_boolean", 4L), ("data.not_a_number", 5L), ("data.ragged_row", 6L)],
            problems.Select(p => (p.Id, p.Row!.Value)));
    }
}
