using PanelChoice.Cli;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>Input and surroundings that nobody means well with: one clear line and the right code, nothing overwritten, nothing smuggled through.</summary>
public class HostileInputTests
{
    [Theory]
    [InlineData("check", "--json", "study.toml", "study file")]
    [InlineData("check", "--json", "panel.csv", "data file")]
    [InlineData("build", "--out", "panel.csv", "data file")]
    [InlineData("build", "--out", "nowhere/../PANEL.csv", "data file")]
    public void Results_never_replace_what_they_are_made_from(string command, string option, string file, string mentions)
    {
        using var study = new SmallStudy();
        var (text, data) = (File.ReadAllText(study.StudyFile), File.ReadAllText(study.DataFile));
        var outcome = CommandLineProcess.InProcess(command, study.StudyFile, option, study.PathOf(file));
        Assert.Equal(73, outcome.Code);
        Assert.Contains(mentions, Assert.Single(outcome.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
        Assert.Equal((text, data), (File.ReadAllText(study.StudyFile), File.ReadAllText(study.DataFile)));
        Assert.Empty(study.OtherFiles());
    }

    [Fact]
    public void A_data_file_with_the_name_of_a_result_is_not_replaced_by_it()
    {
        using var study = new SmallStudy(text => text.Replace("panel.csv", "coefficients.csv", StringComparison.Ordinal));
        File.Move(study.DataFile, study.PathOf("coefficients.csv"));
        Assert.Equal(73, CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.Folder).Code);
        Assert.Equal(["coefficients.csv"], study.OtherFiles());
    }

    [Fact]
    public void A_device_is_not_replaced_by_a_file()
    {
        if (OperatingSystem.IsWindows()) return;
        // A name that no device has: were the check gone, this test would leave a file there instead of ruining a device.
        const string path = "/dev/panelchoice-profile.json";
        using var study = new SmallStudy();
        var outcome = CommandLineProcess.InProcess("check", study.StudyFile, "--json", path);
        Assert.Equal(73, outcome.Code);
        Assert.Equal($"panelchoice: '{path}' cannot be written: it lies among the devices; name an ordinary file.\n", outcome.Error);
        Assert.False(File.Exists(path));
    }

    [Fact]
    public void A_kernel_that_does_not_exist_ends_with_64_and_one_line()
    {
        using var study = new SmallStudy();
        var outcome = CommandLineProcess.Run(
            study.Folder, new Dictionary<string, string> { ["PANELCHOICE_KERNEL"] = "fastest" }, "estimate", "study.toml", "--out", "out");
        Assert.Equal(64, outcome.Code);
        Assert.Contains("PANELCHOICE_KERNEL is 'fastest'", Assert.Single(outcome.Error.TrimEnd().Split('\n')), StringComparison.Ordinal);
        Assert.Empty(study.OtherFiles());
    }

    [Fact]
    public void Control_characters_in_names_do_not_reach_the_terminal()
    {
        using var study = new SmallStudy(text => text
            .Replace("name   = \"minutes\"", "name   = \"min\\u001b[31mutes\\u0007\"", StringComparison.Ordinal)
            .Replace("A small panel", "A small\\n\\u202Epanel", StringComparison.Ordinal));
        var outcome = CommandLineProcess.InProcess("estimate", study.StudyFile);
        Assert.Equal(0, outcome.Code);
        Assert.DoesNotContain(outcome.Out, c => c != '\n' && (char.IsControl(c) || c == '\u202E'));
        Assert.StartsWith("A small \uFFFDpanel\n", outcome.Out, StringComparison.Ordinal);
        var error = CommandLineProcess.InProcess("check", "no\u001b[31msuch.toml").Error;
        Assert.Equal("panelchoice: no\uFFFD[31msuch.toml: there is no such study file; check the path.\n", error);
    }

    [Theory]
    [InlineData("name   = \"minutes\"", "name   = \"minutes\"\nscale = 1e300")]
    [InlineData("name    = \"water\"", "name    = \"water\"\ndissimilarity = 1e-300")]
    public void Figures_that_overflow_end_with_2_not_with_an_internal_error(string from, string to)
    {
        using var study = new SmallStudy(text => text.Replace(from, to, StringComparison.Ordinal));
        var outcome = CommandLineProcess.InProcess("estimate", study.StudyFile);
        Assert.Equal((2, ""), (outcome.Code, outcome.Error));
    }

    [Fact]
    public void Standard_output_that_cannot_be_written_ends_with_73()
    {
        using var study = new SmallStudy();
        using var closed = new ClosedWriter();
        using var error = new StringWriter { NewLine = "\n" };
        Assert.Equal(73, CommandLine.Run(["check", study.StudyFile], new Terminal(closed, error, false, false, false), CancellationToken.None));
        Assert.Equal("panelchoice: 'standard output' cannot be written: No space left on device\n", error.ToString());
    }

    [Fact]
    public void Standard_error_that_is_closed_leaves_the_exit_code()
    {
        using var closed = new ClosedWriter();
        using var output = new StringWriter();
        var terminal = new Terminal(output, closed, false, false, false);
        Assert.Equal(64, CommandLine.Run(["no-such-command"], terminal, CancellationToken.None));
        Assert.Equal(66, CommandLine.Run(["check", "no-such-study.toml"], terminal, CancellationToken.None));
    }

    private sealed class ClosedWriter : StringWriter
    {
        public override void Write(string? value) => throw new IOException("No space left on device");

        public override void WriteLine(string? value) => throw new IOException("No space left on device");
    }
}
