using System.Text;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>A study divided into parts ends as on one machine, bit for bit; whatever is wrong with the parts is told and nothing is written.</summary>
public class PartsTests
{
    private static readonly string[] Results = ["result.json", "coefficients.csv", "replicates.parquet"];

    [Theory]
    [InlineData(1)]
    [InlineData(3)]
    [InlineData(40)]
    public void Any_number_of_parts_gathers_to_the_bytes_of_one_machine(int parts)
    {
        using var study = new SmallStudy();
        var whole = CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("whole"));
        Make(study, parts);
        var gathered = CommandLineProcess.InProcess("gather", study.PathOf("parts"));
        Assert.Equal((whole.Code, ""), (gathered.Code, gathered.Error));
        Assert.Equal(whole.Out[..whole.Out.IndexOf("Written to", StringComparison.Ordinal)], gathered.Out[..gathered.Out.IndexOf("Written to", StringComparison.Ordinal)]);
        AssertSameResults(study.PathOf("whole"), study.PathOf("parts"));
    }

    [Fact]
    public void Parts_made_by_processes_of_their_own_from_the_folder_of_the_study_do_the_same_and_store_no_name()
    {
        using var study = new SmallStudy(data: WithNames);
        CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("whole"));
        for (var part = 2; part >= 1; part--)
        {
            var outcome = CommandLineProcess.Run(study.Folder, "bootstrap", "study.toml", "--part", $"{part}/2", "--out", "parts", "--threads", $"{part}");
            Assert.Equal((0, ""), (outcome.Code, outcome.Error));
            Assert.Contains($"part-{part}-of-2.refits", outcome.Out, StringComparison.Ordinal);
            Assert.All(outcome.Out.Split('\n'), line => Assert.True(line.Length <= 80, line));
        }

        Assert.Equal(["part-1-of-2.refits", "part-2-of-2.refits"], Names(study.PathOf("parts")));
        Assert.All(Directory.GetFiles(study.PathOf("parts")), f => Assert.DoesNotContain("Wilma", Encoding.Latin1.GetString(File.ReadAllBytes(f)), StringComparison.Ordinal));
        Assert.Equal(0, CommandLineProcess.Run(study.Folder, "gather", "parts", "--out", "joined", "--quiet").Code);
        AssertSameResults(study.PathOf("whole"), study.PathOf("joined"));
        Assert.Equal(["part-1-of-2.refits", "part-2-of-2.refits"], Names(study.PathOf("parts")));
    }

    [Fact]
    public void A_part_that_is_killed_goes_on_where_it_stopped_and_ends_with_the_same_bytes()
    {
        using var study = new SmallStudy(text => text.Replace("replicates = 19", "replicates = 1600", StringComparison.Ordinal));
        string[] command = ["bootstrap", "study.toml", "--part", "1/2", "--threads", "1", "--out"];
        Assert.Equal(0, CommandLineProcess.Run(study.Folder, [.. command, "calm"]).Code);
        var whole = File.ReadAllBytes(Path.Combine(study.PathOf("calm"), "part-1-of-2.refits"));
        var unfinished = Path.Combine(study.PathOf("rough"), "part-1-of-2.unfinished");
        var kept = 0L;
        foreach (var share in new[] { 0.05, 0.3, 0.6 })
        {
            using var process = CommandLineProcess.Start(study.Folder, new Dictionary<string, string>(), [.. command, "rough"]);
            while (!process.HasExited && (!File.Exists(unfinished) || new FileInfo(unfinished).Length < share * whole.Length)) Thread.Sleep(2);
            Assert.False(process.HasExited, "the part was done before it could be killed");
            process.Kill();
            process.WaitForExit();
            Assert.Equal(["part-1-of-2.unfinished"], Names(study.PathOf("rough")));
            Assert.InRange(new FileInfo(unfinished).Length, kept + 1, whole.Length - 1);
            kept = new FileInfo(unfinished).Length;
        }

        var told = CommandLineProcess.InProcess("gather", study.PathOf("rough"));
        Assert.Equal(65, told.Code);
        Assert.Matches(@"part-1-of-2\.unfinished: the part is not finished: \d+ of its 808 refits are done; run 'panelchoice bootstrap .*--part 1/2", told.Error);
        Assert.Contains("part 2 of 2 is missing", told.Error, StringComparison.Ordinal);
        var last = CommandLineProcess.Run(study.Folder, [.. command, "rough"]);
        Assert.Equal((0, ""), (last.Code, last.Error));
        Assert.Matches(@"of these\s+refits\s+were\s+there\s+from\s+an\s+earlier\s+run", last.Out);
        Assert.Equal(["part-1-of-2.refits"], Names(study.PathOf("rough")));
        Assert.Equal(whole, File.ReadAllBytes(Path.Combine(study.PathOf("rough"), "part-1-of-2.refits")));
    }

    [Fact]
    public void A_signal_ends_a_part_with_130_and_says_that_what_was_finished_is_kept()
    {
        if (OperatingSystem.IsWindows()) return;
        using var study = new SmallStudy(text => text.Replace("replicates = 19", "replicates = 1000000", StringComparison.Ordinal));
        using var process = CommandLineProcess.Start(study.Folder, new Dictionary<string, string>(), "bootstrap", "study.toml", "--part", "1/1", "--out", "parts", "--threads", "1");
        try
        {
            var unfinished = Path.Combine(study.PathOf("parts"), "part-1-of-1.unfinished");
            while (!process.HasExited && (!File.Exists(unfinished) || new FileInfo(unfinished).Length < 5000)) Thread.Sleep(5);
            using (var kill = System.Diagnostics.Process.Start("kill", ["-TERM", $"{process.Id}"])) kill.WaitForExit();
            Assert.True(process.WaitForExit(TimeSpan.FromSeconds(60)), "the run did not stop");
            Assert.Equal(130, process.ExitCode);
            Assert.Equal(
                "panelchoice: stopped before it was done; the refits that were finished are kept, and the same command goes on from there.\n", process.StandardError.ReadToEnd());
        }
        finally
        {
            if (!process.HasExited) process.Kill();
        }
    }

    [Fact]
    public void A_part_that_is_complete_is_not_made_again()
    {
        using var study = new SmallStudy();
        Make(study, 1);
        var file = Path.Combine(study.PathOf("parts"), "part-1-of-1.refits");
        var written = DateTime.UtcNow.AddHours(-3);
        File.SetLastWriteTimeUtc(file, written);
        var again = Bootstrap(study, "1/1");
        Assert.Equal((0, ""), (again.Code, again.Error));
        Assert.Contains("It was complete already", again.Out, StringComparison.Ordinal);
        Assert.Equal(written, File.GetLastWriteTimeUtc(file));
        Assert.Equal(["part-1-of-1.refits"], Names(study.PathOf("parts")));
    }

    [Fact]
    public void A_part_that_is_damaged_is_made_again_and_this_is_told()
    {
        using var study = new SmallStudy();
        Make(study, 1);
        var file = Path.Combine(study.PathOf("parts"), "part-1-of-1.refits");
        var bytes = File.ReadAllBytes(file);
        File.WriteAllBytes(file, bytes[..^20]);
        var again = Bootstrap(study, "1/1");
        Assert.Equal(0, again.Code);
        Assert.Contains("is damaged (it breaks off inside a record) and is made again.", Assert.Single(again.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
        Assert.Equal(bytes, File.ReadAllBytes(file));
    }

    [Fact]
    public void Parts_made_and_gathered_with_a_store_have_the_bytes_of_those_without()
    {
        using var study = new SmallStudy();
        Make(study, 2);
        string[] store = ["--store", study.PathOf("kept.store"), "--memory", "1"];
        foreach (var part in new[] { "1/2", "2/2" })
        {
            var made = CommandLineProcess.InProcess(["bootstrap", study.StudyFile, "--part", part, "--out", study.PathOf("kept"), .. store]);
            Assert.Equal((0, ""), (made.Code, made.Error));
        }

        foreach (var name in Names(study.PathOf("parts")))
            Assert.Equal(File.ReadAllBytes(Path.Combine(study.PathOf("parts"), name)), File.ReadAllBytes(Path.Combine(study.PathOf("kept"), name)));
        Assert.Equal(0, CommandLineProcess.InProcess("gather", study.PathOf("parts"), "--quiet").Code);
        Assert.Equal((0, ""), CommandLineProcess.InProcess(["gather", study.PathOf("kept"), "--quiet", .. store]) is var o ? (o.Code, o.Error) : default);
        AssertSameResults(study.PathOf("parts"), study.PathOf("kept"));
        Assert.Equal(64, CommandLineProcess.InProcess("gather", study.PathOf("parts"), "--memory", "5").Code);
    }

    [Fact]
    public void A_complete_part_is_recognised_without_reading_a_cell_of_the_data()
    {
        using var study = new SmallStudy();
        Make(study, 1);
        // A store of something else would be refused as soon as anybody opened it.
        File.WriteAllText(study.PathOf("kept.store"), "no store");
        string[] again = ["bootstrap", study.StudyFile, "--part", "1/1", "--out", study.PathOf("parts"), "--store", study.PathOf("kept.store")];
        var known = CommandLineProcess.InProcess(again);
        Assert.Equal((0, ""), (known.Code, known.Error));
        Assert.Contains("It was complete already", known.Out, StringComparison.Ordinal);

        // Other data, another seed: what is there is not what is asked for, and the long way finds it out.
        File.AppendAllText(study.DataFile, "\n");
        Assert.Equal(65, CommandLineProcess.InProcess(again).Code);
        Assert.Contains("differs in the data file", Bootstrap(study, "1/1").Error, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("part-2-of-2.refits", "hello, world, this is a letter\n", "it is not a file of refits; move it away")]
    [InlineData("part-2-of-2.unfinished", "hello, world, this is a letter\n", "it is not a file of refits; move it away")]
    [InlineData("part-2-of-2.refits", "panelchoice-refits/9\n", "it has the layout panelchoice-refits/9")]
    public void A_file_of_something_else_in_the_place_of_a_part_is_left_alone(string name, string text, string told)
    {
        using var study = new SmallStudy();
        Directory.CreateDirectory(study.PathOf("parts"));
        File.WriteAllText(Path.Combine(study.PathOf("parts"), name), text);
        var outcome = Bootstrap(study, "2/2");
        Assert.Equal(65, outcome.Code);
        Assert.Contains(told, Assert.Single(outcome.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
        Assert.Equal(text, File.ReadAllText(Path.Combine(study.PathOf("parts"), name)));
    }

    [Theory]
    [InlineData(".refits")]
    [InlineData(".unfinished")]
    public void A_part_of_another_state_of_the_study_is_left_alone(string ending)
    {
        using var study = new SmallStudy();
        Make(study, 1);
        var file = Path.Combine(study.PathOf("parts"), "part-1-of-1" + ending);
        if (ending != ".refits") File.Move(Path.ChangeExtension(file, ".refits"), file);
        var bytes = File.ReadAllBytes(file);
        File.AppendAllText(study.StudyFile, "# changed\n");
        var outcome = Bootstrap(study, "1/1");
        Assert.Equal(65, outcome.Code);
        Assert.Matches(
            @"was made from something else and differs in the study file \(SHA-256 [0-9a-f]{12} there, SHA-256 [0-9a-f]{12} here\); delete it",
            Assert.Single(outcome.Error.TrimEnd().Split('\n')));
        Assert.Equal(bytes, File.ReadAllBytes(file));
    }

    [Fact]
    public void A_part_that_another_run_is_at_work_on_is_left_to_it()
    {
        using var study = new SmallStudy();
        Directory.CreateDirectory(study.PathOf("parts"));
        using var held = new FileStream(Path.Combine(study.PathOf("parts"), "part-1-of-1.unfinished"), FileMode.Create, FileAccess.ReadWrite, FileShare.None);
        var second = Bootstrap(study, "1/1");
        Assert.Equal(73, second.Code);
        Assert.Contains("another run is at work on part 1 of 1", Assert.Single(second.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
        var gather = CommandLineProcess.InProcess("gather", study.PathOf("parts"));
        Assert.Equal(65, gather.Code);
        Assert.Contains("another run is at work on this part", Assert.Single(gather.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
    }

    [Fact]
    public void Missing_parts_are_named_with_what_to_run_and_end_with_66()
    {
        using var study = new SmallStudy();
        foreach (var part in new[] { 1, 4, 9 }) Bootstrap(study, $"{part}/12");
        var outcome = CommandLineProcess.Run(study.Folder, "gather", "parts");
        Assert.Equal((66, ""), (outcome.Code, outcome.Out));
        Assert.Equal(
            "panelchoice: parts: parts 2, 3, 5 to 8, 10 to 12 of 12 are missing; run 'panelchoice bootstrap study.toml --part 2/12 --out parts', "
            + "and the same for the others.\n", outcome.Error);
        Assert.Equal(3, Names(study.PathOf("parts")).Count);
    }

    [Theory]
    [InlineData("nowhere", "there is no such folder")]
    [InlineData(".", "there is no part of an analysis in this folder")]
    public void A_folder_without_parts_ends_with_66(string folder, string told)
    {
        using var study = new SmallStudy();
        var outcome = CommandLineProcess.InProcess("gather", study.PathOf(folder));
        Assert.Equal(66, outcome.Code);
        Assert.Contains(told, Assert.Single(outcome.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
    }

    [Fact]
    public void Whatever_is_wrong_with_the_parts_is_told_in_a_line_each_and_nothing_is_written()
    {
        using var study = new SmallStudy();
        Make(study, 3);
        var parts = study.PathOf("parts");
        var second = Path.Combine(parts, "part-2-of-3.refits");
        var good = File.ReadAllBytes(second);

        byte[] changed = [.. good];
        changed[^100] ^= 1;
        Rejected(study, "part-2-of-3.refits: the file is damaged: a checksum does not agree; delete it and run 'panelchoice bootstrap", () => File.WriteAllBytes(second, changed));
        Rejected(study, "part-2-of-3.refits: the file is damaged: it breaks off inside a record", () => File.WriteAllBytes(second, good[..^1]));
        Rejected(study, "part-2-of-3.refits: the file is damaged: it goes on after its end", () => File.WriteAllBytes(second, [.. good, 0]));
        Rejected(study, "part-2-of-3.refits: the file is damaged: it breaks off in its first line", () => File.WriteAllBytes(second, []));
        Rejected(study, "part-2-of-3.refits: it is not a file of refits; move it out of the folder", () => File.WriteAllText(second, "a letter to somebody else"));
        Rejected(study, "part-2-of-3.unfinished: the part is not finished: ", () =>
        {
            File.Delete(second);
            File.WriteAllBytes(Path.ChangeExtension(second, ".unfinished"), good[..^60]);
        });
        File.Delete(Path.ChangeExtension(second, ".unfinished"));
        File.WriteAllBytes(second, good);
        var copy = Path.Combine(parts, "part-2-of-3 (copy).refits");
        Rejected(study, "part-2-of-3.refits: it holds part 2 of 3, as part-2-of-3 (copy).refits does; keep one of the two", () => File.Copy(second, copy));
        File.Delete(copy);

        Bootstrap(study, "2/4");
        Rejected(study, "part-2-of-4.refits: it is one of 4 parts, but part-1-of-3.refits is one of 3", () => { });
        // What a run of another division has left unfinished is no part that is missing.
        var left = Path.Combine(parts, "part-2-of-4.unfinished");
        File.Move(Path.ChangeExtension(left, ".refits"), left);
        Rejected(study, "part-2-of-4.unfinished: it is one of 4 parts, but part-1-of-3.refits is one of 3; keep the parts of one division", () => { });
        File.Delete(left);

        var text = File.ReadAllText(study.StudyFile);
        Rejected(study, "the parts were made from something else and differ in the study file", () => File.AppendAllText(study.StudyFile, "\n"));
        File.Delete(second);
        Bootstrap(study, "2/3");
        Rejected(study, "part-2-of-3.refits: compared with part-1-of-3.refits, it was made from something else and differs in the study file", () => { });
        File.WriteAllText(study.StudyFile, text);
        File.WriteAllBytes(second, good);
        Rejected(study, "differ in the data file (SHA-256 ", () => File.AppendAllText(study.DataFile, "\n"));
    }

    [Fact]
    public void Parts_of_different_kernels_are_not_joined()
    {
        using var study = new SmallStudy();
        var scalar = new Dictionary<string, string> { ["PANELCHOICE_KERNEL"] = "scalar" };
        Bootstrap(study, "1/2");
        Assert.Equal(0, CommandLineProcess.Run(study.Folder, scalar, "bootstrap", study.StudyFile, "--part", "2/2", "--out", "parts").Code);
        Rejected(study, "part-2-of-2.refits: compared with part-1-of-2.refits, it was made from something else and differs in the kernel (scalar there, vector", () => { });

        File.Delete(Path.Combine(study.PathOf("parts"), "part-1-of-2.refits"));
        Assert.Equal(0, CommandLineProcess.Run(study.Folder, scalar, "bootstrap", study.StudyFile, "--part", "1/2", "--out", "parts").Code);
        Rejected(study, "differ in the kernel (scalar there, vector", () => { });
        Assert.Equal(0, CommandLineProcess.Run(study.Folder, scalar, "gather", "parts", "--quiet").Code);
        Assert.Contains("\"kernel\": \"scalar\"", File.ReadAllText(Path.Combine(study.PathOf("parts"), "result.json")), StringComparison.Ordinal);
    }

    [Fact]
    public void A_study_that_lies_elsewhere_now_can_be_named()
    {
        using var study = new SmallStudy();
        Make(study, 1);
        CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("whole"));
        Directory.Move(study.PathOf("parts"), study.PathOf("deep"));
        Directory.CreateDirectory(study.PathOf("parts"));
        Directory.Move(study.PathOf("deep"), Path.Combine(study.PathOf("parts"), "deep"));
        var deep = Path.Combine(study.PathOf("parts"), "deep");
        var lost = CommandLineProcess.InProcess("gather", deep);
        Assert.Equal(66, lost.Code);
        Assert.Contains("the parts name this study file, which is not there; name it with --study FILE.", Assert.Single(lost.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
        Assert.Equal(0, CommandLineProcess.InProcess("gather", deep, "--study", study.StudyFile, "--quiet").Code);
        AssertSameResults(study.PathOf("whole"), deep);
    }

    [Fact]
    public void An_estimate_that_is_not_to_be_trusted_has_empty_parts_ends_with_2_and_gathers_to_the_same_bytes()
    {
        using var study = new SmallStudy(text => text.Replace("[estimate]", "[[term]]\nname = \"minutes again\"\ncolumn = \"minutes\"\n\n[estimate]", StringComparison.Ordinal));
        Assert.Equal(2, CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("whole")).Code);
        var part = Bootstrap(study, "1/1");
        Assert.Equal((2, ""), (part.Code, part.Error));
        Assert.Contains("There is nothing to refit", part.Out, StringComparison.Ordinal);
        Assert.Equal(2, CommandLineProcess.InProcess("gather", study.PathOf("parts")).Code);
        AssertSameResults(study.PathOf("whole"), study.PathOf("parts"));
    }

    [Fact]
    public void Without_bootstrap_and_jackknife_a_part_is_empty_and_says_so()
    {
        using var study = new SmallStudy(text => text.Replace("replicates = 19", "replicates = 0", StringComparison.Ordinal)
            .Replace("jackknife = \"refit\"", "jackknife = \"off\"", StringComparison.Ordinal));
        var part = Bootstrap(study, "1/1");
        Assert.Equal(0, part.Code);
        Assert.Matches(@"the\s+part\s+is\s+empty", part.Out);
        Assert.Equal(0, CommandLineProcess.InProcess("gather", study.PathOf("parts")).Code);
    }

    [Theory]
    [InlineData("bootstrap", "study.toml")]
    [InlineData("bootstrap", "study.toml", "--part", "1/2")]
    [InlineData("bootstrap", "study.toml", "--out", "parts")]
    [InlineData("bootstrap", "study.toml", "--part", "3/2", "--out", "parts")]
    [InlineData("bootstrap", "study.toml", "--part", "3", "--out", "parts")]
    [InlineData("bootstrap", "study.toml", "--part", "/16", "--out", "parts")]
    [InlineData("bootstrap", "study.toml", "--part", "1/2", "--out", "")]
    [InlineData("gather")]
    [InlineData("gather", "")]
    [InlineData("gather", "parts", "--study", "")]
    public void A_command_line_that_makes_no_sense_ends_with_64(params string[] args)
    {
        var outcome = CommandLineProcess.InProcess(args);
        Assert.Equal((64, ""), (outcome.Code, outcome.Out));
        Assert.StartsWith("panelchoice: ", outcome.Error, StringComparison.Ordinal);
    }

    private static void Make(SmallStudy study, int parts)
    {
        for (var part = parts; part >= 1; part--) Assert.Equal((0, ""), Bootstrap(study, $"{part}/{parts}") is var o ? (o.Code, o.Error) : default);
    }

    private static Outcome Bootstrap(SmallStudy study, string part) =>
        CommandLineProcess.InProcess("bootstrap", study.StudyFile, "--part", part, "--out", study.PathOf("parts"));

    /// <summary>Does something to the parts and sees them rejected in one line of this content, with nothing written.</summary>
    private static void Rejected(SmallStudy study, string told, Action change)
    {
        change();
        var before = Names(study.PathOf("parts"));
        var outcome = CommandLineProcess.InProcess("gather", study.PathOf("parts"));
        Assert.Equal((65, ""), (outcome.Code, outcome.Out));
        Assert.Contains(told, Assert.Single(outcome.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
        Assert.Equal(before, Names(study.PathOf("parts")));
    }

    private static void AssertSameResults(string one, string other)
    {
        foreach (var name in Results) Assert.True(File.ReadAllBytes(Path.Combine(one, name)).AsSpan().SequenceEqual(File.ReadAllBytes(Path.Combine(other, name))), name);
    }

    private static List<string> Names(string folder) => [.. Directory.EnumerateFileSystemEntries(folder).Select(f => Path.GetFileName(f)!).Order(StringComparer.Ordinal)];

    /// <summary>The panel with names that would be recognised.</summary>
    private static string WithNames(string data) =>
        string.Join('\n', data.TrimEnd().Split('\n').Select((line, i) => i == 0 ? line : "Wilma" + line)) + "\n";
}
