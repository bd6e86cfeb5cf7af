using PanelChoice.Numerics;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>An estimation that is ended at any moment goes on when the same command is given again, and ends with the bytes of one that was never ended.</summary>
public class ResumeTests
{
    private const int Replicates = 300;

    private static readonly string[] Results = ["coefficients.csv", "replicates.parquet", "result.json"];

    [Fact]
    public void A_run_killed_when_record_n_is_on_the_disk_goes_on_to_the_same_bytes_for_ten_seeded_n()
    {
        using var study = Bootstrap();
        Estimate(study, "calm");
        var random = new CounterRandom(20, "moments of kills", 0);
        for (var k = 0; k < 10; k++)
        {
            var n = 1 + random.Next(Replicates);
            var kept = Killed(study, $"rough {k}", $"RefitsKept {n}", n);
            Assert.InRange(kept, n, Replicates);
            Assert.Equal(["replicates.journal"], Names(study.PathOf($"rough {k}")));
            // The first goes on in a process of its own, the others where it takes less time.
            string[] command = ["estimate", study.StudyFile, "--out", study.PathOf($"rough {k}"), "--threads", "1"];
            var last = k == 0 ? CommandLineProcess.Run(study.Folder, command) : CommandLineProcess.InProcess(command);
            Assert.Equal(
                (0, $"panelchoice: {kept} of {Replicates} bootstrap replicates were found in {study.PathOf($"rough {k}")}, where an earlier run kept them; this one goes on from there.\n"),
                (last.Code, last.Error));
            AssertSameResults(study.PathOf("calm"), study.PathOf($"rough {k}"));
        }
    }

    [Fact]
    public void A_run_killed_again_and_again_gets_on_each_time()
    {
        using var study = Bootstrap();
        Estimate(study, "calm");
        var before = 0;
        foreach (var n in new[] { 1, 40, 100, 220 })
        {
            var kept = Killed(study, "rough", $"RefitsKept {n}", n);
            Assert.True(kept > before);
            before = kept;
        }

        // Other threads, and a design that is read from a store, are no other run.
        var last = CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("rough"), "--threads", "2", "--quiet", "--store", study.PathOf("kept.store"), "--memory", "1");
        Assert.Equal((0, "", ""), (last.Code, last.Out, last.Error));
        AssertSameResults(study.PathOf("calm"), study.PathOf("rough"));
    }

    [Fact]
    public void A_run_killed_during_the_jackknife_goes_on_to_the_same_bytes()
    {
        using var study = ManyPersons();
        Estimate(study, "calm");
        Assert.Equal(64, Killed(study, "rough", "RefitsKept 33", 33));
        var last = Estimate(study, "rough");
        Assert.Contains("0 of 19 bootstrap replicates and 64 of 80 refits of the jackknife were found", last.Error, StringComparison.Ordinal);
        AssertSameResults(study.PathOf("calm"), study.PathOf("rough"));
    }

    [Theory]
    [InlineData("RefitsKept 35")] // the last of 16 + 19
    [InlineData("FileWritten 1")]
    [InlineData("FileWritten 3")]
    [InlineData("FileNamed 1")]
    [InlineData("FileNamed 2")]
    [InlineData("FileNamed 3")]
    public void A_run_killed_between_its_last_refit_and_its_end_leaves_whole_files_and_goes_on_to_the_same_bytes(string place)
    {
        using var study = new SmallStudy();
        Estimate(study, "calm");
        Directory.CreateDirectory(study.PathOf("rough"));
        foreach (var name in Results) File.WriteAllText(Path.Combine(study.PathOf("rough"), name), "old");
        Assert.Equal(35, Killed(study, "rough", place, 35));
        var replaced = place.StartsWith("FileNamed", StringComparison.Ordinal) ? place[^1] - '0' : 0;
        string[] order = ["result.json", "coefficients.csv", "replicates.parquet"];
        for (var i = 0; i < order.Length; i++)
            Assert.Equal(
                i < replaced ? File.ReadAllBytes(Path.Combine(study.PathOf("calm"), order[i])) : "old"u8.ToArray(), File.ReadAllBytes(Path.Combine(study.PathOf("rough"), order[i])));
        var last = Estimate(study, "rough");
        Assert.Contains("19 of 19 bootstrap replicates and 16 of 16 refits of the jackknife were found", last.Error, StringComparison.Ordinal);
        AssertSameResults(study.PathOf("calm"), study.PathOf("rough"));
    }

    [Fact]
    public void An_interrupt_ends_with_130_says_what_is_kept_and_the_same_command_goes_on_to_the_same_bytes()
    {
        if (OperatingSystem.IsWindows()) return;
        using var study = Bootstrap();
        Estimate(study, "calm");
        using (var run = new HeldRun(study, "RefitsKept 100", "--out", "rough"))
        {
            run.UntilKept(JournalOf(study, "rough"), 100);
            var interrupted = run.Interrupt();
            var kept = HeldRun.CountIn(JournalOf(study, "rough"));
            Assert.Equal(
                (130, "", $"panelchoice: stopped before it was done; {kept} of {Replicates} bootstrap replicates are kept in rough, and the same command goes on from there.\n"),
                (interrupted.Code, interrupted.Out, interrupted.Error));
        }

        Assert.Equal(["replicates.journal"], Names(study.PathOf("rough")));
        Estimate(study, "rough");
        AssertSameResults(study.PathOf("calm"), study.PathOf("rough"));
    }

    [Fact]
    public void A_record_that_was_torn_is_cut_off_and_made_again()
    {
        using var study = Bootstrap();
        Estimate(study, "calm");
        Killed(study, "rough", "RefitsKept 60", 60);
        var whole = File.ReadAllBytes(JournalOf(study, "rough"));
        foreach (var missing in new[] { 1, 40, 100 })
        {
            File.WriteAllBytes(JournalOf(study, "rough"), whole[..^missing]);
            var last = Estimate(study, "rough");
            Assert.Contains("63 of 300 bootstrap replicates were found", last.Error, StringComparison.Ordinal);
            AssertSameResults(study.PathOf("calm"), study.PathOf("rough"));
        }
    }

    [Fact]
    public void A_journal_of_another_study_is_replaced_with_one_sentence()
    {
        using var study = Bootstrap();
        Killed(study, "rough", "RefitsKept 60", 60);
        File.WriteAllText(study.StudyFile, File.ReadAllText(study.StudyFile).Replace("starts = 1", "starts = 1\nseed = 77", StringComparison.Ordinal));
        Estimate(study, "calm");
        var last = Estimate(study, "rough", "--quiet");
        Assert.Matches(
            @"^panelchoice: .*replicates\.journal is not used and is replaced: it was made from something else and differs in the study file \(SHA-256 .{12} there, SHA-256 .{12} here\)\.\n$",
            last.Error);
        AssertSameResults(study.PathOf("calm"), study.PathOf("rough"));
    }

    [Fact]
    public void A_second_run_on_a_folder_is_refused_in_one_sentence_while_the_first_is_at_work()
    {
        using var study = Bootstrap();
        Estimate(study, "calm");
        using (var first = new HeldRun(study, "RefitsKept 10", "--out", "rough"))
        {
            first.UntilKept(JournalOf(study, "rough"), 10);
            var second = CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("rough"));
            Assert.Equal(
                (73, "", $"panelchoice: '{study.PathOf("rough")}' cannot be written: another run is at work on it; wait until that has ended, or name another folder.\n"),
                (second.Code, second.Out, second.Error));
            first.Kill();
        }

        Estimate(study, "rough");
        AssertSameResults(study.PathOf("calm"), study.PathOf("rough"));
    }

    [Fact]
    public void A_disk_that_is_full_ends_with_73_in_one_sentence_and_what_is_kept_is_whole()
    {
        if (!OperatingSystem.IsLinux()) return;
        using var study = Bootstrap();
        Estimate(study, "calm");
        // A file may not grow beyond this many bytes: the system refuses to write as it does on a full disk.
        var full = CommandLineProcess.RunLimited(study.Folder, fileBytes: 20_000, "estimate", "study.toml", "--out", "rough", "--threads", "1");
        Assert.Equal((73, ""), (full.Code, full.Out));
        Assert.StartsWith("panelchoice: 'rough' cannot be written: ", Assert.Single(full.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
        Assert.Equal(["replicates.journal"], Names(study.PathOf("rough")));
        using (var stream = File.OpenRead(JournalOf(study, "rough")))
        {
            var kept = PanelChoice.Results.Refits.RefitFile.Read("rough", stream);
            Assert.Null(kept.Damage);
            Assert.Equal(kept.ValidLength, stream.Length);
            Assert.InRange(kept.Outcomes.Count, 1, Replicates - 1);
        }

        Estimate(study, "rough");
        AssertSameResults(study.PathOf("calm"), study.PathOf("rough"));
    }

    [Fact]
    public void A_file_of_something_else_under_the_name_of_the_journal_is_left_alone()
    {
        using var study = new SmallStudy();
        Directory.CreateDirectory(study.PathOf("out"));
        File.WriteAllText(JournalOf(study, "out"), "Monday: two replicates of a fine wine, most agreeable.\n");
        var outcome = CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("out"));
        Assert.Equal((65, ""), (outcome.Code, outcome.Out));
        Assert.Contains("it is not a file of refits; move it away", Assert.Single(outcome.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
        Assert.Equal(["replicates.journal"], Names(study.PathOf("out")));
        Assert.StartsWith("Monday", File.ReadAllText(JournalOf(study, "out")), StringComparison.Ordinal);
    }

    /// <summary>Runs until a place, kills there, and gives how many refits are kept.</summary>
    private static int Killed(SmallStudy study, string folder, string place, int kept)
    {
        using var run = new HeldRun(study, place, "--out", folder);
        run.UntilKept(JournalOf(study, folder), kept);
        run.Kill();
        return HeldRun.CountIn(JournalOf(study, folder));
    }

    private static Outcome Estimate(SmallStudy study, string folder, params string[] more)
    {
        var outcome = CommandLineProcess.InProcess(["estimate", study.StudyFile, "--out", study.PathOf(folder), .. more]);
        Assert.Equal(0, outcome.Code);
        return outcome;
    }

    private static string JournalOf(SmallStudy study, string folder) => Path.Combine(study.PathOf(folder), "replicates.journal");

    private static void AssertSameResults(string one, string other)
    {
        Assert.Equal(Results, Names(other));
        foreach (var name in Results) Assert.True(File.ReadAllBytes(Path.Combine(one, name)).AsSpan().SequenceEqual(File.ReadAllBytes(Path.Combine(other, name))), name);
    }

    private static List<string> Names(string folder) => [.. Directory.EnumerateFileSystemEntries(folder).Select(f => Path.GetFileName(f)!).Order(StringComparer.Ordinal)];

    /// <summary>A bootstrap alone, of so many replicates that it is kept in ten batches.</summary>
    private static SmallStudy Bootstrap() => new(text => text.Replace("replicates = 19", $"replicates = {Replicates}", StringComparison.Ordinal)
        .Replace("jackknife = \"refit\"", "jackknife = \"off\"", StringComparison.Ordinal).Replace("starts = 2", "starts = 1", StringComparison.Ordinal)
        .Replace("draws = 499", "draws = 99", StringComparison.Ordinal));

    /// <summary>80 persons, so that the jackknife is kept in three batches.</summary>
    private static SmallStudy ManyPersons() => new(data: text =>
    {
        var lines = text.TrimEnd().Split('\n');
        return string.Join('\n', Enumerable.Range(1, 5).SelectMany(copy => lines[1..].Select(line => $"{copy}{line}")).Prepend(lines[0])) + "\n";
    });
}
