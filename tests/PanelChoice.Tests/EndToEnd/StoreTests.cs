using System.Globalization;
using System.Text;
using PanelChoice.Numerics;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>The store from the command line.</summary>
public class StoreTests
{
    [Fact]
    public void A_store_changes_no_byte_of_the_result_at_the_first_run_and_at_the_second()
    {
        using var study = new SmallStudy();
        string[] common = ["estimate", study.StudyFile, "--out"];
        Assert.Equal(0, CommandLineProcess.InProcess([.. common, study.PathOf("memory")]).Code);
        foreach (var run in new[] { "first", "second" })
            Assert.Equal(0, CommandLineProcess.InProcess([.. common, study.PathOf(run), "--store", study.PathOf("kept.store"), "--memory", "1"]).Code);
        foreach (var name in new[] { "result.json", "coefficients.csv", "replicates.parquet" })
            foreach (var run in new[] { "first", "second" })
                Assert.Equal(File.ReadAllBytes(Path.Combine(study.PathOf("memory"), name)), File.ReadAllBytes(Path.Combine(study.PathOf(run), name)));
    }

    [Fact]
    public void A_store_that_cannot_be_used_ends_with_65_and_one_sentence()
    {
        using var study = new SmallStudy();
        var store = study.PathOf("kept.store");
        string[] run = ["estimate", study.StudyFile, "--store", store];
        Assert.Equal(0, CommandLineProcess.InProcess(run).Code);

        File.AppendAllText(study.DataFile, "\n");
        Refused("is not what it was when the store was made");
        File.WriteAllText(store, "something else");
        Refused("is no store of a design");
        Assert.Equal("something else", File.ReadAllText(store));

        void Refused(string words)
        {
            var outcome = CommandLineProcess.InProcess(run);
            Assert.Equal((65, ""), (outcome.Code, outcome.Out));
            Assert.Contains(words, Assert.Single(outcome.Error.Trim().Split('\n')), StringComparison.Ordinal);
        }
    }

    [Fact]
    public void What_a_run_that_was_killed_has_left_of_a_store_is_taken_away_when_the_store_is_made()
    {
        using var study = new SmallStudy();
        var stem = study.PathOf(".kept.store.");
        var (left, young, open, other) = (stem + new string('a', 32) + ".part", stem + new string('b', 32) + ".part", stem + new string('c', 32) + ".part", stem + "mine.part");
        foreach (var file in new[] { left, young, open, other }) File.WriteAllText(file, "half a store");
        foreach (var file in new[] { left, open, other }) File.SetLastWriteTimeUtc(file, DateTime.UtcNow.AddHours(-1));
        using (new FileStream(open, FileMode.Open, FileAccess.Read, FileShare.Read))
            Assert.Equal(0, CommandLineProcess.InProcess("build", study.StudyFile, "--store", study.PathOf("kept.store")).Code);
        Assert.Equal([false, true, true, true], new[] { left, young, open, other }.Select(File.Exists));
    }

    [Fact]
    public void Rows_in_any_order_give_the_bytes_of_memory_and_leave_nothing_but_the_store()
    {
        // So many rows that they are not kept: each has a number without meaning besides.
        using var study = new SmallStudy(
            text => text.Replace("replicates = 19", "replicates = 0", StringComparison.Ordinal).Replace("\"refit\"", "\"off\"", StringComparison.Ordinal)
                .Replace("starts = 2", "starts = 1", StringComparison.Ordinal).Replace("draws = 499", "draws = 99", StringComparison.Ordinal),
            data => Scattered(data, copies: 130));
        string[] common = ["estimate", study.StudyFile, "--out"];
        Assert.Equal(0, CommandLineProcess.InProcess([.. common, study.PathOf("memory")]).Code);
        var kept = CommandLineProcess.InProcess([.. common, study.PathOf("kept"), "--store", study.PathOf("kept.store"), "--memory", "1"]);
        Assert.Equal((0, ""), (kept.Code, kept.Error));
        Assert.Equal(File.ReadAllBytes(Path.Combine(study.PathOf("memory"), "result.json")), File.ReadAllBytes(Path.Combine(study.PathOf("kept"), "result.json")));
        Assert.Equal(["kept", "kept.store", "memory"], study.OtherFiles());
    }

    [Fact]
    public async Task A_store_that_is_cut_off_while_it_is_read_is_one_sentence_and_what_was_done_is_kept()
    {
        if (OperatingSystem.IsWindows()) return; // There a file in use cannot be cut off.
        using var study = new SmallStudy(_ => Study().Replace("replicates = 0", "replicates = 120", StringComparison.Ordinal), _ => Data(persons: 40));
        string[] common = ["bootstrap", "study.toml", "--part", "1/1", "--out", "parts", "--store", "kept.store", "--memory", "1", "--threads", "1"];
        var part = study.PathOf("parts/part-1-of-1.unfinished");
        using (var process = CommandLineProcess.Start(study.Folder, new Dictionary<string, string>(), common))
        {
            var error = process.StandardError.ReadToEndAsync();
            var output = process.StandardOutput.ReadToEndAsync();
            // With its first refits on the disk the run is in the midst of reading the store.
            while (!process.WaitForExit(2) && !(File.Exists(part) && new FileInfo(part).Length > 3_000)) { }
            using (var cut = new FileStream(study.PathOf("kept.store"), FileMode.Open, FileAccess.Write, FileShare.ReadWrite | FileShare.Delete)) cut.SetLength(1_000);
            await process.WaitForExitAsync();
            Assert.Equal((65, ""), (process.ExitCode, await output));
            Assert.Equal(
                "panelchoice: kept.store: the store cannot be read any more (the file ends before it should), so the run was given up and no result written; "
                + "check the disk and what else writes to the file, delete the store, and run the same command again.\n", await error);
        }

        Assert.Equal(["part-1-of-1.unfinished"], Directory.GetFiles(study.PathOf("parts")).Select(f => Path.GetFileName(f)));
        File.Delete(study.PathOf("kept.store"));
        var again = CommandLineProcess.Run(study.Folder, common);
        Assert.Equal((0, ""), (again.Code, again.Error));
        Assert.Contains("of these refits were there from an earlier run", string.Join(' ', again.Out.Split((char[]?)null, StringSplitOptions.RemoveEmptyEntries)), StringComparison.Ordinal);
    }

    [Fact]
    public void A_store_can_be_built_ahead_of_the_runs_that_read_it()
    {
        using var study = new SmallStudy();
        var store = study.PathOf("kept.store");
        var built = CommandLineProcess.InProcess("build", study.StudyFile, "--store", store);
        Assert.Equal((0, ""), (built.Code, built.Error));
        Assert.Contains("panelchoice estimate", built.Out, StringComparison.Ordinal);
        Assert.Equal(["kept.store"], study.OtherFiles());
        var bytes = File.ReadAllBytes(store);
        Assert.Equal(0, CommandLineProcess.InProcess("estimate", study.StudyFile, "--store", store).Code);
        Assert.Equal(bytes, File.ReadAllBytes(store));
        Assert.Equal(64, CommandLineProcess.InProcess("build", study.StudyFile, "--store", store, "--out", "x.csv").Code);
        File.WriteAllBytes(store, bytes[..500]);
        Assert.Equal(65, CommandLineProcess.InProcess("build", study.StudyFile, "--store", store).Code);
    }

    [Fact]
    public void What_cannot_be_meant_is_told_before_anything_is_read()
    {
        using var study = new SmallStudy();
        Assert.Equal(64, CommandLineProcess.InProcess("estimate", study.StudyFile, "--memory", "100").Code);
        Assert.Equal(64, CommandLineProcess.InProcess("estimate", study.StudyFile, "--store", "x", "--memory", "none").Code);
        Assert.Equal(64, CommandLineProcess.InProcess("estimate", study.StudyFile, "--store", "").Code);
        Assert.Equal(73, CommandLineProcess.InProcess("estimate", study.StudyFile, "--store", study.DataFile).Code);
        Assert.Equal(73, CommandLineProcess.InProcess("estimate", study.StudyFile, "--store", study.PathOf("no/such/folder/kept.store")).Code);
    }

    [Fact]
    public void A_design_of_four_times_the_budget_stays_below_the_budget_and_two_hundred_megabytes_and_far_below_memory()
    {
        // Peak resident memory is the system's own record of a process, which only Linux shows in a file.
        if (!OperatingSystem.IsLinux()) return;
        const int Budget = 12;
        using var study = new SmallStudy(_ => Study(), _ => Data(persons: 750));
        var memory = Peak("memory");
        var kept = Peak("kept", "--store", "kept.store", "--memory", $"{Budget}");
        Assert.Equal(File.ReadAllBytes(Path.Combine(study.PathOf("memory"), "result.json")), File.ReadAllBytes(Path.Combine(study.PathOf("kept"), "result.json")));
        // 44 columns of doubles, and a second design as large: half of the file is what a run without a store holds.
        var design = new FileInfo(study.PathOf("kept.store")).Length * 44 / 92;
        Assert.InRange(design, 4 * Budget * 1_000_000L, long.MaxValue);
        Assert.InRange(kept, 0, (Budget + 200) * 1_000_000L);
        // A process that held the design would take all of it on top.
        Assert.InRange(memory - kept, design / 2, long.MaxValue);

        long Peak(string output, params string[] more)
        {
            using var process = CommandLineProcess.Start(study.Folder, new Dictionary<string, string>(), ["estimate", "study.toml", "--threads", "1", "--out", output, .. more]);
            var error = process.StandardError.ReadToEndAsync();
            var peak = 0L;
            // The figure only rises, so that the last look before the end has all but what the end itself takes.
            for (; !process.WaitForExit(20); peak = Math.Max(peak, HighWater(process.Id))) { }
            Assert.Equal((0, ""), (process.ExitCode, error.Result));
            return peak;
        }
    }

    /// <summary>The persons several times under other names, and all rows in an order of no meaning.</summary>
    private static string Scattered(string data, int copies)
    {
        var lines = data.TrimEnd().Split('\n');
        var random = new CounterRandom(3, "order", 0);
        var rows = Enumerable.Range(1, copies).SelectMany(copy => lines.Skip(1).Select(line => $"{copy}0{line}"));
        return lines[0] + "\n" + string.Join('\n', rows.OrderBy(_ => random.Next(1 << 30))) + "\n";
    }

    private static long HighWater(int process)
    {
        try
        {
            var line = File.ReadLines($"/proc/{process}/status").FirstOrDefault(l => l.StartsWith("VmHWM:", StringComparison.Ordinal));
            return line is null ? 0 : long.Parse(line["VmHWM:".Length..].Replace("kB", "", StringComparison.Ordinal), CultureInfo.InvariantCulture) * 1024;
        }
        catch (IOException)
        {
            return 0; // It ended just now.
        }
    }

    /// <summary>Two columns and ten lags of each: much design from little data.</summary>
    private static string Study()
    {
        var study = new StringBuilder("""
            [panel]
            file = "panel.csv"
            person = "who"
            occasion = "day"
            alternative = "mode"
            chosen = "taken"
            [history]
            previous = "step"
            [estimate]
            starts = 1
            [inference]
            jackknife = "off"
            [inference.bootstrap]
            replicates = 0
            [diagnostics]
            draws = 99

            """);
        foreach (var column in "ab")
        {
            study.Append(CultureInfo.InvariantCulture, $"[[term]]\nname = \"{column}\"\ncolumn = \"{column}\"\n");
            for (var lag = 1; lag <= 10; lag++) study.Append(CultureInfo.InvariantCulture, $"[[term]]\nname = \"{column}{lag}\"\ncolumn = \"{column}\"\nlag = {lag}\n");
        }

        return study.ToString();
    }

    /// <summary>Columns with all digits of a double, which no whole number can stand for.</summary>
    private static string Data(int persons)
    {
        var random = new CounterRandom(3, "many occasions", 0);
        var text = new StringBuilder("who,day,mode,taken,a,b\n");
        for (var person = 1; person <= persons; person++)
            for (var day = 0; day < 200; day++)
            {
                var chosen = random.Next(2);
                for (var j = 0; j < 2; j++)
                    text.Append(CultureInfo.InvariantCulture, $"{person},{day},{"xy"[j]},{(j == chosen ? 1 : 0)},{random.NextDouble()},{random.NextDouble()}\n");
            }

        return text.ToString();
    }
}
