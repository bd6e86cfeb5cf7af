using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>Each exit code, each stream.</summary>
public class ExitCodeTests
{
    [Fact]
    public void A_good_study_ends_with_0_a_report_on_standard_output_and_nothing_on_standard_error()
    {
        using var study = new SmallStudy();
        var outcome = CommandLineProcess.Run(study.Folder, "estimate", "study.toml", "--threads", "2");
        Assert.Equal("", outcome.Error);
        Assert.Equal(0, outcome.Code);
        Assert.StartsWith("A small panel\n", outcome.Out, StringComparison.Ordinal);
        Assert.Empty(study.OtherFiles());
    }

    [Fact]
    public void Without_strict_a_flagged_dependence_ends_with_0_and_with_it_with_3()
    {
        using var study = new SmallStudy(text => text.Replace("[diagnostics]", "[diagnostics]\nlevel = 0.999", StringComparison.Ordinal));
        Assert.Equal(0, CommandLineProcess.InProcess("estimate", study.StudyFile).Code);
        Assert.Equal(3, CommandLineProcess.InProcess("estimate", study.StudyFile, "--strict").Code);
    }

    [Fact]
    public void An_estimate_that_is_not_to_be_trusted_ends_with_2_even_under_strict_and_its_files_say_why()
    {
        // The same column twice: the two coefficients cannot be told apart.
        using var study = new SmallStudy(text => text.Replace("[estimate]", "[[term]]\nname = \"minutes again\"\ncolumn = \"minutes\"\n\n[estimate]", StringComparison.Ordinal));
        var outcome = CommandLineProcess.InProcess("estimate", study.StudyFile, "--strict", "--out", study.PathOf("out"));
        Assert.Equal(2, outcome.Code);
        var json = File.ReadAllText(Path.Combine(study.PathOf("out"), "result.json"));
        Assert.Contains("\"status\": \"not_identified\"", json, StringComparison.Ordinal);
        Assert.Contains("minutes again", outcome.Out, StringComparison.Ordinal);
        Assert.Contains("not to be trusted", outcome.Out, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("estimate")]
    [InlineData("no-such-command")]
    [InlineData("estimate", "study.toml", "--no-such-option")]
    [InlineData("estimate", "study.toml", "--threads", "0")]
    [InlineData("estimate", "study.toml", "--threads", "many")]
    [InlineData("estimate", "study.toml", "--threads", "-1")]
    [InlineData("estimate", "study.toml", "and", "another")]
    [InlineData("build", "study.toml", "--out", "table.xlsx")]
    [InlineData("check", "study.toml", "--strict")]
    [InlineData("check", "study.toml", "--json", "")]
    [InlineData("build", "study.toml", "--out", "")]
    [InlineData("estimate", "study.toml", "--out", " ")]
    [InlineData("estimate", "")]
    [InlineData("demo", "")]
    public void A_command_line_that_makes_no_sense_ends_with_64(params string[] args)
    {
        var outcome = CommandLineProcess.InProcess(args);
        Assert.Equal(64, outcome.Code);
        Assert.Equal("", outcome.Out);
        Assert.StartsWith("panelchoice: ", outcome.Error, StringComparison.Ordinal);
        Assert.DoesNotContain("   at ", outcome.Error, StringComparison.Ordinal);
    }

    [Fact]
    public void A_mistyped_command_is_told_and_nothing_else()
    {
        var outcome = CommandLineProcess.InProcess("estimat");
        Assert.Equal(64, outcome.Code);
        Assert.StartsWith("panelchoice: Unrecognized command or argument 'estimat'.\nRun ", outcome.Error, StringComparison.Ordinal);
    }

    [Fact]
    public void No_argument_at_all_ends_with_64() => Assert.Equal(64, CommandLineProcess.InProcess().Code);

    [Theory]
    [InlineData("check")]
    [InlineData("build")]
    [InlineData("estimate")]
    public void A_study_that_is_not_there_ends_with_66_and_one_line(string command)
    {
        var outcome = CommandLineProcess.InProcess(command, Path.Combine(Path.GetTempPath(), "no-such-folder", "study.toml"));
        Assert.Equal(66, outcome.Code);
        Assert.Equal("", outcome.Out);
        Assert.Single(outcome.Error.TrimEnd().Split('\n'));
    }

    [Fact]
    public void Data_that_are_not_there_end_with_66_and_leave_nothing_behind()
    {
        using var study = new SmallStudy();
        File.Delete(study.DataFile);
        var outcome = CommandLineProcess.Run(study.Folder, "estimate", "study.toml", "--out", "out");
        Assert.Equal(66, outcome.Code);
        Assert.Contains("panel.csv", outcome.Error, StringComparison.Ordinal);
        Assert.Empty(study.OtherFiles());
    }

    [Fact]
    public void An_output_folder_in_whose_place_a_file_stands_ends_with_73_and_the_file_stays()
    {
        using var study = new SmallStudy();
        File.WriteAllText(study.PathOf("taken"), "mine");
        var outcome = CommandLineProcess.Run(study.Folder, "estimate", "study.toml", "--out", "taken");
        Assert.Equal(73, outcome.Code);
        Assert.Single(outcome.Error.TrimEnd().Split('\n'));
        Assert.Equal("mine", File.ReadAllText(study.PathOf("taken")));
    }

    [Theory]
    [InlineData("build", "--out", "nowhere/covariates.csv")]
    [InlineData("check", "--json", "nowhere/profile.json")]
    [InlineData("estimate", "--out", "study.toml/below")]
    public void An_output_that_cannot_be_written_ends_with_73(string command, string option, string path)
    {
        using var study = new SmallStudy();
        var outcome = CommandLineProcess.InProcess(command, study.StudyFile, option, path.StartsWith("study", StringComparison.Ordinal) ? study.PathOf(path) : path);
        Assert.Equal(73, outcome.Code);
        Assert.Single(outcome.Error.TrimEnd().Split('\n'));
    }

    [Fact]
    public void An_interrupt_before_the_end_gives_130_and_leaves_nothing_behind()
    {
        using var study = new SmallStudy();
        using var interrupted = new CancellationTokenSource();
        interrupted.Cancel();
        var outcome = CommandLineProcess.InProcess(false, interrupted.Token, "estimate", study.StudyFile, "--out", study.PathOf("out"));
        Assert.Equal(130, outcome.Code);
        Assert.Equal("", outcome.Out);
        Assert.Single(outcome.Error.TrimEnd().Split('\n'));
        Assert.Empty(study.OtherFiles());
    }

    [Fact]
    public void A_signal_from_outside_ends_a_long_run_with_130_and_leaves_only_what_it_can_go_on_from()
    {
        if (OperatingSystem.IsWindows()) return;
        using var study = new SmallStudy(text => text.Replace("replicates = 19", "replicates = 1000000", StringComparison.Ordinal));
        using var process = CommandLineProcess.Start(study.Folder, new Dictionary<string, string>(), "estimate", "study.toml", "--out", "out", "--threads", "1");
        try
        {
            while (!process.HasExited && HeldRun.CountIn(Path.Combine(study.PathOf("out"), "replicates.journal")) < 40) Thread.Sleep(5);
            Assert.False(process.HasExited, "the run was over before it could be interrupted");
            // TERM and INT have the same handler; INT is ignored by children of a shell that runs its jobs in the background.
            using (var kill = System.Diagnostics.Process.Start("kill", ["-TERM", process.Id.ToString(System.Globalization.CultureInfo.InvariantCulture)])) kill.WaitForExit();
            Assert.True(process.WaitForExit(TimeSpan.FromSeconds(60)), "the run did not stop");
            Assert.Equal(130, process.ExitCode);
            Assert.Equal("", process.StandardOutput.ReadToEnd());
            Assert.Equal(["replicates.journal"], Directory.EnumerateFileSystemEntries(study.PathOf("out")).Select(f => Path.GetFileName(f)!));
        }
        finally
        {
            if (!process.HasExited) process.Kill();
        }
    }

    [Fact]
    public void Help_and_version_end_with_0()
    {
        var help = CommandLineProcess.InProcess("--help");
        Assert.Equal(0, help.Code);
        Assert.All(help.Out.Split('\n'), line => Assert.True(line.Length <= 80, line));
        Assert.Contains("panelchoice [command] [options]", help.Out, StringComparison.Ordinal);
        Assert.All(["check", "build", "estimate", "demo", "--threads", "--quiet", "--no-color"], word => Assert.Contains(word, help.Out, StringComparison.Ordinal));
        var version = CommandLineProcess.InProcess("--version");
        Assert.Equal(0, version.Code);
        Assert.Matches(@"^panelchoice \d+\.\d+\.\d+\n$", version.Out);
    }
}
