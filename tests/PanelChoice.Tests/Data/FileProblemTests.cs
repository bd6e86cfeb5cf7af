using System.Text;
using PanelChoice.Data;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Data;

/// <summary>Files that cannot be read at all: one problem, one clear line, never an exception.</summary>
public sealed class FileProblemTests : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    private static Problem Only(string path)
    {
        var problem = Assert.Single(ChoiceTableReader.Read(StudySketch.Over(path)).Problems);
        Assert.StartsWith(Path.GetFileName(path), problem.Sentence, StringComparison.Ordinal);
        Assert.DoesNotContain('\n', problem.Sentence);
        Assert.DoesNotContain("   at ", problem.Sentence, StringComparison.Ordinal);
        return problem;
    }

    [Theory]
    [InlineData("nowhere.csv")]
    [InlineData("nowhere/panel.parquet")]
    public void A_missing_file(string name)
    {
        var problem = Only(folder.PathOf(name));
        Assert.Equal("data.not_found", problem.Id);
        Assert.Contains(folder.PathOf(name), problem.Remedy, StringComparison.Ordinal);
    }

    [Fact]
    public void A_folder()
    {
        Directory.CreateDirectory(folder.PathOf("panel.csv"));
        var problem = Only(folder.PathOf("panel.csv"));
        Assert.Equal(("data.unreadable", "panel.csv: this is a folder; name a file that can be read."), (problem.Id, problem.Sentence));
    }

    [Theory]
    [InlineData("panel.xlsx")]
    [InlineData("panel")]
    [InlineData("panel.gz")]
    [InlineData("panel.csv.zip")]
    public void An_ending_that_says_nothing(string name)
    {
        var problem = Only(folder.Write(name, "person,day,mode,chosen\n1,1,bus,1\n"));
        Assert.Equal("data.unknown_format", problem.Id);
        Assert.Contains(".csv, .csv.gz, .tsv, .txt or .parquet", problem.Remedy, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("panel.csv")]
    [InlineData("panel.csv.gz")]
    [InlineData("panel.parquet")]
    public void An_empty_file(string name) => Assert.Equal("data.empty_file", Only(folder.Write(name, "")).Id);

    [Fact]
    public void An_empty_file_that_was_packed() => Assert.Equal("data.empty_file", Only(folder.Write("panel.csv.gz", TemporaryFolder.Gzip([]))).Id);

    [Theory]
    [InlineData("\nperson,day,mode,chosen\n1,1,bus,1\n")]
    [InlineData(",,,\n1,1,bus,1\n")]
    public void An_empty_first_row(string text)
    {
        var problem = Only(folder.Write("panel.csv", text));
        Assert.Equal(("data.empty_file", 1L), (problem.Id, problem.Row));
    }

    [Theory]
    [InlineData("person,day,mode,chosen")]
    [InlineData("person,day,mode,chosen\n")]
    [InlineData("person,day,mode,chosen\n\n\n")]
    public void A_header_and_nothing_else(string text)
    {
        var problem = Only(folder.Write("panel.csv", text));
        Assert.Equal(("data.no_rows", "panel.csv: there are no rows below the column names; give the panel's rows."), (problem.Id, problem.Sentence));
    }

    [Fact]
    public void A_parquet_file_without_rows() =>
        Assert.Equal(
            "data.no_rows",
            Only(new ParquetTable().Add<int>("person").Add<int>("day").AddText("mode").Add<bool>("chosen").WriteTo(folder.PathOf("panel.parquet"))).Id);

    [Fact]
    public void Utf16_without_its_mark() =>
        Assert.Equal("data.not_text", Only(folder.Write("panel.csv", Encoding.Unicode.GetBytes("person,day,mode,chosen\n1,1,bus,1\n"))).Id);

    [Fact]
    public void Parquet_called_csv()
    {
        var path = new ParquetTable().Add("person", 1).Add("day", 1).AddText("mode", "bus").Add("chosen", true).WriteTo(folder.PathOf("panel.parquet"));
        File.Move(path, folder.PathOf("panel.csv"));
        Assert.Equal("data.not_text", Only(folder.PathOf("panel.csv")).Id);
    }

    [Fact]
    public void Csv_called_parquet() => Assert.Equal("data.unreadable", Only(folder.Write("panel.parquet", "person,day,mode,chosen\n1,1,bus,1\n")).Id);

    [Fact]
    public void Csv_called_gzip() => Assert.Equal("data.unreadable", Only(folder.Write("panel.csv.gz", "person,day,mode,chosen\n1,1,bus,1\n")).Id);

    [Theory]
    [InlineData(0.3)]
    [InlineData(0.9)]
    [InlineData(0.9999)]
    public void A_gzip_file_that_was_cut_off(double share)
    {
        var random = new Random(1);
        var text = "person,day,mode,chosen,note\n" + string.Concat(Enumerable.Range(1, 20000).Select(i => $"{i},1,bus,1,{random.NextDouble()}\n"));
        var packed = TemporaryFolder.Gzip(Encoding.UTF8.GetBytes(text));
        var problems = ChoiceTableReader.Read(StudySketch.Over(folder.Write("panel.csv.gz", packed[..(int)(packed.Length * share)]))).Problems;
        // The last line may be cut in the middle; that the file is cut is said first.
        Assert.Equal("data.unreadable", problems[0].Id);
        Assert.Contains("ends before its content does", problems[0].Sentence, StringComparison.Ordinal);
        Assert.All(problems.Skip(1), p => Assert.Equal("data.ragged_row", p.Id));
    }

    [Fact]
    public void A_gzip_file_with_a_damaged_byte()
    {
        var packed = TemporaryFolder.Gzip(Encoding.UTF8.GetBytes("person,day,mode,chosen\n1,1,bus,1\n1,1,car,0\n"));
        packed[^6] ^= 1;
        Assert.Equal(
            "panel.csv.gz: the file is not packed with gzip, or is damaged; pack the panel again, or give the plain .csv file.",
            Only(folder.Write("panel.csv.gz", packed)).Sentence);
    }

    [Fact]
    public void A_parquet_file_whose_lengths_ask_for_more_memory_than_there_is()
    {
        byte[] bytes = [.. "PAR1"u8, .. Enumerable.Repeat((byte)0xFF, 100), 0xFF, 0xFF, 0xFF, 0x7F, .. "PAR1"u8];
        Assert.Equal("data.unreadable", Only(folder.Write("panel.parquet", bytes)).Id);
    }

    [Fact]
    public void A_parquet_file_that_was_cut_off()
    {
        var path = new ParquetTable().Add("person", 1, 2).Add("day", 1, 1).AddText("mode", "bus", "bus").Add("chosen", true, true).WriteTo(folder.PathOf("whole.parquet"));
        var bytes = File.ReadAllBytes(path);
        Assert.Equal("data.unreadable", Only(folder.Write("panel.parquet", bytes[..(bytes.Length / 2)])).Id);
    }

    [Fact]
    public void A_parquet_file_with_damaged_pages_never_throws()
    {
        int[] persons = [.. Enumerable.Range(0, 500)];
        var path = new ParquetTable().Add("person", persons).Add("day", persons).AddText("mode", [.. persons.Select(p => $"mode {p % 7}")])
            .Add("chosen", [.. persons.Select(_ => true)]).WriteTo(folder.PathOf("whole.parquet"));
        var bytes = File.ReadAllBytes(path);
        var random = new Random(3);
        for (var trial = 0; trial < 60; trial++)
        {
            var damaged = (byte[])bytes.Clone();
            for (var k = 0; k < 8; k++) damaged[random.Next(4, damaged.Length - 8)] ^= (byte)random.Next(1, 256);
            var read = ChoiceTableReader.Read(StudySketch.Over(folder.Write("panel.parquet", damaged)));
            Assert.True(read.Value is null != read.Problems.IsEmpty);
        }
    }

    [Fact]
    public void A_file_without_any_line_end_is_not_read_to_its_end_in_one_piece()
    {
        var text = "person,day,mode,chosen\n1,1,\"" + new string('x', 20_000_000);
        var problem = Only(folder.Write("panel.csv", text));
        Assert.Equal(("data.bad_quotes", 2L), (problem.Id, problem.Row));
    }
}
