using System.Globalization;
using PanelChoice.Cli;
using PanelChoice.Numerics;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>What a terminal and a pipe get to see.</summary>
public class TerminalTests
{
    private const char Escape = '\u001b';

    [Theory]
    [InlineData("check")]
    [InlineData("build")]
    [InlineData("estimate")]
    public void Nothing_is_wider_than_80_columns_even_with_long_names(string command)
    {
        using var study = new SmallStudy(text => text
            .Replace("name   = \"minutes\"", "name   = \"minutes from door to door, with the walk at both ends and the wait in between\"", StringComparison.Ordinal)
            .Replace("name    = \"water\"", "name    = \"everythingthatfloatsandsomethingsthatdonotbutlookasiftheydid-and-then-some\"", StringComparison.Ordinal)
            .Replace("A small panel", "A small panel with a title that goes on for longer than anybody would ever care to read on a single line", StringComparison.Ordinal));
        var outcome = CommandLineProcess.InProcess(command, study.StudyFile);
        Assert.Equal(0, outcome.Code);
        Assert.All(outcome.Out.Split('\n'), line => Assert.True(line.Length <= 80, line));
    }

    [Fact]
    public void A_pipe_gets_plain_text_without_blanks_at_line_ends()
    {
        using var study = new SmallStudy();
        var outcome = CommandLineProcess.Run(study.Folder, "build", "study.toml");
        Assert.Equal(0, outcome.Code);
        Assert.DoesNotContain(Escape, outcome.Out);
        Assert.All(outcome.Out.Split('\n'), line => Assert.Equal(line.TrimEnd(), line));
    }

    [Fact]
    public void A_terminal_gets_bold_headings_unless_it_asks_for_none()
    {
        using var study = new SmallStudy();
        var bold = CommandLineProcess.InProcess(terminal: true, CancellationToken.None, "build", study.StudyFile).Out;
        var plain = CommandLineProcess.InProcess(terminal: true, CancellationToken.None, "build", study.StudyFile, "--no-color").Out;
        Assert.Contains(Escape, bold);
        Assert.DoesNotContain(Escape, plain);
    }

    [Theory]
    [InlineData("1", "xterm", false)]
    [InlineData("", "xterm", true)]
    [InlineData(null, "xterm", true)]
    [InlineData(null, "dumb", false)]
    public void NO_COLOR_and_a_dumb_terminal_are_honoured(string? noColour, string term, bool colour) =>
        Assert.Equal(colour, PanelChoice.Cli.Terminal.Allows(name => name == "NO_COLOR" ? noColour : term));

    [Fact]
    public void Quiet_prints_no_table_and_still_tells_problems()
    {
        using var study = new SmallStudy();
        Assert.Equal("", CommandLineProcess.InProcess("build", study.StudyFile, "--quiet").Out);
        using var bad = new SmallStudy(text => text.Replace("column = \"minutes\"", "column = \"hours\"", StringComparison.Ordinal));
        Assert.Contains("hours", CommandLineProcess.InProcess("build", bad.StudyFile, "--quiet").Error, StringComparison.Ordinal);
    }

    [Fact]
    public void Options_may_stand_before_or_after_the_command()
    {
        using var study = new SmallStudy();
        Assert.Equal("", CommandLineProcess.InProcess("--quiet", "build", study.StudyFile).Out);
    }

    [Fact]
    public void Machine_files_have_decimal_points_and_line_feeds_under_any_culture()
    {
        using var study = new SmallStudy();
        var before = CultureInfo.CurrentCulture;
        try
        {
            CultureInfo.CurrentCulture = Cultures.Comma;
            Assert.Equal(0, CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("comma"), "--quiet").Code);
            CultureInfo.CurrentCulture = CultureInfo.InvariantCulture;
            Assert.Equal(0, CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("point"), "--quiet").Code);
        }
        finally
        {
            CultureInfo.CurrentCulture = before;
        }

        foreach (var name in new[] { "result.json", "coefficients.csv", "replicates.parquet" })
            Assert.Equal(File.ReadAllBytes(Path.Combine(study.PathOf("point"), name)), File.ReadAllBytes(Path.Combine(study.PathOf("comma"), name)));
        Assert.DoesNotContain((byte)'\r', File.ReadAllBytes(Path.Combine(study.PathOf("point"), "result.json")));
    }

    [Fact]
    public void Progress_says_how_many_were_found_and_lines_are_told_beside_it()
    {
        using var error = new StringWriter();
        var seen = TextWriter.Synchronized(error);
        var options = new RunOptions(1, false, true, new Terminal(TextWriter.Null, seen, false, true, false), CancellationToken.None);
        var deadline = DateTime.UtcNow.AddSeconds(60);
        ProgressDisplay.Run(options, (work, tell) =>
        {
            tell("what was found");
            work.Report(new WorkProgress("bootstrap replicates", 137, 300) { Found = 137 });
            // The display draws when it comes to it.
            while (!Text().Contains("137 of 300, 137 found", StringComparison.Ordinal) && DateTime.UtcNow < deadline) Thread.Sleep(10);
            return true;
        });
        Assert.Contains("137 of 300, 137 found", Text(), StringComparison.Ordinal);
        Assert.Contains("what was found", Text(), StringComparison.Ordinal);

        string Text()
        {
            lock (seen) return error.ToString();
        }
    }
}
