using System.Globalization;
using System.Reflection;
using System.Text.Json;
using System.Text.RegularExpressions;
using PanelChoice.Cli;
using PanelChoice.Results;
using PanelChoice.Study;
using PanelChoice.Tests.EndToEnd;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Readme;

/// <summary>What README.md promises is what the program does.</summary>
public partial class ReadmeTests
{
    private static readonly string Text = File.ReadAllText(Path.Combine(Repository.Root, "README.md"));

    [Fact]
    public void The_worked_study_reads_without_a_problem()
    {
        using var folder = new TemporaryFolder();
        var study = StudyFileReader.Read(folder.Write("study.toml", StudyBlock().Match(Text).Groups[1].Value));
        Assert.Empty(study.Problems);
        Assert.Equal("Harbour crossing, spring wave", study.Value!.Title);
        Assert.Equal(PreviousRule.Workday, study.Value.History.Previous);
        Assert.Equal(5, study.Value.Terms.Length);
    }

    [Fact]
    public void The_table_of_exit_codes_is_complete()
    {
        var told = CodeRow().Matches(Text).Select(m => int.Parse(m.Groups[1].Value, CultureInfo.InvariantCulture));
        var known = typeof(ExitCode).GetFields(BindingFlags.Public | BindingFlags.Static).Select(f => (int)f.GetRawConstantValue()!);
        Assert.Equal(known.Order(), told.Order());
    }

    [Fact]
    public void Every_command_and_option_of_the_help_is_told()
    {
        var help = string.Concat(new[] { "check", "build", "estimate", "bootstrap", "gather", "demo" }.Select(c => CommandLineProcess.InProcess(c, "--help").Out));
        foreach (var option in Option().Matches(help).Select(m => m.Value).Distinct().Where(o => o is not "--help"))
            Assert.Contains("`" + option, Text, StringComparison.Ordinal);
    }

    [Fact]
    public void Every_top_field_of_the_result_document_is_told()
    {
        using var document = JsonDocument.Parse(ResultJson.Bytes(HandMadeStages.Result(HandMadeStages.Many)));
        Assert.All(document.RootElement.EnumerateObject(), field => Assert.Contains($"`{field.Name}`", Text, StringComparison.Ordinal));
    }

    [Fact]
    public void The_two_commands_stand_at_the_top_where_the_build_finds_them()
    {
        var lines = Text.Split('\n').Where(l => l.StartsWith("    dotnet ", StringComparison.Ordinal)).Select(l => l.Trim()).ToList();
        Assert.Equal(["dotnet run -c Release --project src/PanelChoice.Cli -- demo", "dotnet test PanelChoice.sln -c Release"], lines);
    }

    [GeneratedRegex("```toml\n(.*?)```", RegexOptions.Singleline)]
    private static partial Regex StudyBlock();

    [GeneratedRegex(@"^\| (\d+) \|", RegexOptions.Multiline)]
    private static partial Regex CodeRow();

    [GeneratedRegex("--[a-z-]+")]
    private static partial Regex Option();
}
