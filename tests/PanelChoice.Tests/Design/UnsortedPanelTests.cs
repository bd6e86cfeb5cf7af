using System.Globalization;
using System.IO.Compression;
using PanelChoice.Data;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;
using static PanelChoice.Tests.Design.PartedDesignTests;

namespace PanelChoice.Tests.Design;

/// <summary>Rows that stand in no order of persons are sorted on the disk on their way into a store: the same bits as in memory, and nothing left behind.</summary>
public sealed class UnsortedPanelTests : IDisposable
{
    private readonly TemporaryFolder folder = new();
    private readonly StudySpecification study;
    private readonly string[] lines;

    public UnsortedPanelTests()
    {
        study = Write(folder, "recorded", "drop", "");
        lines = File.ReadAllLines(study.Panel.FullPath);
    }

    private string Folder => Path.GetDirectoryName(study.Panel.FullPath)!;

    public void Dispose() => folder.Dispose();

    [Theory]
    [InlineData("scattered")]
    [InlineData("persons turned round")]
    [InlineData("one row at the end")]
    public void A_store_made_from_rows_in_another_order_has_the_bits_of_memory(string how)
    {
        Mix(how);
        using var memory = Good(PanelAnalysisSample.Read(study, WorkContext.Quiet));
        using var kept = Good(Keep());
        Same(memory.Sample, kept.Sample);
        Same(memory.Design, kept.Design);
        Same(memory.Static()!.Design, kept.Static()!.Design);
    }

    [Fact]
    public void Order_makes_no_byte_of_a_store_but_those_that_name_the_file()
    {
        // The file's hash and time are in the header, behind the blocks.
        using (Good(Keep())) { }
        var sorted = File.ReadAllBytes(folder.PathOf("kept.store"));
        File.Delete(folder.PathOf("kept.store"));
        Mix("scattered");
        using (Good(Keep())) { }
        var mixed = File.ReadAllBytes(folder.PathOf("kept.store"));
        var header = (int)BitConverter.ToInt64(sorted, 12);
        Assert.InRange(header, 10_000, sorted.Length);
        Assert.True(sorted.AsSpan(64, header - 64).SequenceEqual(mixed.AsSpan(64, header - 64)));
    }

    [Theory]
    [InlineData(1_000, "many runs, merged in several rounds")]
    [InlineData(40_000, "some runs")]
    [InlineData(100_000_000, "one run")]
    public void Rows_come_back_by_person_and_in_their_order_however_little_memory_there_is(long memoryBytes, string how)
    {
        Assert.NotEmpty(how);
        Mix("scattered");
        var whole = Good(ChoiceTableReader.Read(study));
        using var sort = new RowSort(folder.PathOf("x"), memoryBytes, WorkContext.Quiet);
        var scan = Good(TableScan.Of(study, 0, sort));
        Assert.False(scan.IsInOrder);
        for (var visit = 0; visit < 2; visit++)
        {
            var tables = new List<ChoiceTable>();
            Assert.Empty(scan.Visit(100, _ => true, (table, _) => tables.Add(table)));
            Assert.InRange(tables.Count, 5, 60);
            var rows = tables.SelectMany(t => t.SourceRow.Select((row, i) => (Person: t.Person.Levels[t.Person.Codes[i]], Row: row, t.Occasion[i], Minutes: t.Numbers["minutes"][i], Weather: t.Texts["weather"].Levels[t.Texts["weather"].Codes[i]], Offered: t.Offered[i], Weight: t.Weight[i]))).ToList();
            var expected = Enumerable.Range(0, whole.Rows)
                .Select(i => (Person: whole.Person.Levels[whole.Person.Codes[i]], Row: whole.SourceRow[i], whole.Occasion[i], Minutes: whole.Numbers["minutes"][i], Weather: whole.Texts["weather"].Levels[whole.Texts["weather"].Codes[i]], Offered: whole.Offered[i], Weight: whole.Weight[i]))
                .OrderBy(r => int.Parse(r.Person, CultureInfo.InvariantCulture)).ThenBy(r => r.Row).ToList();
            Assert.Equal(expected, rows);
        }
    }

    [Fact]
    public void Problems_are_told_with_the_rows_of_the_file_as_in_memory()
    {
        var random = new CounterRandom(8, "mixed", 0);
        File.WriteAllLines(study.Panel.FullPath, [lines[0], .. lines.Skip(1).Select((l, i) => i % 9 == 3 ? Other(l, 4, "0") : l).OrderBy(_ => random.Next(1 << 30))]);
        var memory = PanelAnalysisSample.Read(study, WorkContext.Quiet).Problems.Select(p => p.Sentence).ToList();
        Assert.NotEmpty(memory);
        Assert.Equal(memory, Keep().Problems.Select(p => p.Sentence));
        AssertNothingLeft();
    }

    [Fact]
    public void A_packed_file_is_sorted_as_a_plain_one()
    {
        Mix("scattered");
        using var memory = Good(PanelAnalysisSample.Read(study, WorkContext.Quiet));
        using (var packed = new GZipStream(File.Create(study.Panel.FullPath + ".gz"), CompressionLevel.Fastest))
            packed.Write(File.ReadAllBytes(study.Panel.FullPath));
        var other = Renamed("panel.csv.gz");
        using var kept = Good(PanelAnalysisSample.Keep(other, folder.PathOf("kept.store"), 0, 0, 100, WorkContext.Quiet));
        Same(memory.Design, kept.Design);
    }

    [Fact]
    public void Too_little_room_on_the_disk_is_said_before_anything_is_written()
    {
        Mix("scattered");
        using var sort = new RowSort(folder.PathOf("kept.store"), 1 << 20, WorkContext.Quiet, _ => 12_345);
        var refused = Assert.Throws<DiskWriteException>(() => TableScan.Of(study, 0, sort));
        Assert.Equal("the rows of panel.csv are not sorted by person, and sorting them takes 0.2 MB in its folder, where 0.0 MB are free.", refused.Message);
        AssertNothingLeft();
    }

    [Fact]
    public void A_place_that_cannot_be_written_is_an_error_of_the_store_and_not_of_the_data()
    {
        Mix("scattered");
        Assert.Throws<IOException>(() => PanelAnalysisSample.Keep(study, folder.PathOf("no/such/kept.store"), 0, 0, 100, WorkContext.Quiet));
    }

    [Fact]
    public void An_interrupt_while_rows_are_sorted_leaves_nothing_behind()
    {
        Mix("scattered");
        using var interrupt = new CancellationTokenSource();
        var seen = new List<string>();
        var progress = new Reports(step =>
        {
            if (step != "sorting the rows") return;
            seen.AddRange(Directory.GetFiles(Folder).Select(f => Path.GetFileName(f)));
            interrupt.Cancel();
        });
        Assert.Throws<OperationCanceledException>(
            () => PanelAnalysisSample.Keep(study, folder.PathOf("kept.store"), 0, 0, 100, new WorkContext(1, progress, interrupt.Token)));
        AssertNothingLeft();
    }

    private Checked<PanelAnalysisSample> Keep() => PanelAnalysisSample.Keep(study, folder.PathOf("kept.store"), 0, 0, 100, WorkContext.Quiet);

    private StudySpecification Renamed(string data)
    {
        var text = File.ReadAllText(study.File).Replace("panel.csv", data, StringComparison.Ordinal);
        return Good(StudyFileReader.Read(folder.Write("other.toml", text)));
    }

    private void Mix(string how)
    {
        var random = new CounterRandom(7, "mixed", 0);
        IEnumerable<string> rows = how switch
        {
            "scattered" => lines.Skip(1).OrderBy(_ => random.Next(1 << 30)),
            "persons turned round" => lines.Skip(1).GroupBy(l => l.Split(',')[0]).Reverse().SelectMany(p => p),
            _ => [.. lines[2..], lines[1]],
        };
        File.WriteAllLines(study.Panel.FullPath, [lines[0], .. rows]);
    }

    private void AssertNothingLeft() =>
        Assert.Equal(["panel.csv", "study.toml"], Directory.GetFiles(Folder).Select(f => Path.GetFileName(f)!).Order(StringComparer.Ordinal));

    private static string Other(string line, int column, string value) => string.Join(',', line.Split(',').Select((c, i) => i == column ? value : c));

    private sealed class Reports(Action<string> each) : IProgress<WorkProgress>
    {
        public void Report(WorkProgress value) => each(value.Step);
    }
}
