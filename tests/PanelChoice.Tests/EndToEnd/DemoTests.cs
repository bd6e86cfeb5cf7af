using System.Text.Json;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>The demonstration works in a scratch folder as it does for a newcomer.</summary>
public sealed class DemoTests : IDisposable
{
    private readonly TemporaryFolder folder = new();

    public void Dispose() => folder.Dispose();

    [Fact]
    public void It_writes_both_panels_runs_both_and_finds_dependence_only_where_there_is_some()
    {
        var scratch = Path.GetDirectoryName(folder.PathOf("x"))!;
        var outcome = CommandLineProcess.Run(scratch, "demo");
        Assert.Equal("", outcome.Error);
        Assert.Equal(0, outcome.Code);
        Assert.All(outcome.Out.Split('\n'), line => Assert.True(line.Length <= 80, line));
        var demo = Path.Combine(scratch, "panelchoice-demo");
        Assert.Equal(
            ["marrowick-habit", "marrowick-habit.csv", "marrowick-habit.toml", "marrowick-quiet", "marrowick-quiet.csv", "marrowick-quiet.toml"],
            Directory.GetFileSystemEntries(demo).Select(f => Path.GetFileName(f)).Order(StringComparer.Ordinal));
        Assert.Equal("dependence", Verdict(Path.Combine(demo, "marrowick-habit")));
        Assert.Equal("none_found", Verdict(Path.Combine(demo, "marrowick-quiet")));

        // No commuter's own name reaches what is printed or passed on.
        var names = File.ReadLines(Path.Combine(demo, "marrowick-habit.csv")).Skip(1).Select(l => l.Split(',')[0]).Distinct().ToList();
        var told = outcome.Out + File.ReadAllText(Path.Combine(demo, "marrowick-habit", "result.json"));
        Assert.All(names, name => Assert.DoesNotMatch($@"\b{System.Text.RegularExpressions.Regex.Escape(name)}\b", told));
    }

    [Fact]
    public void A_folder_that_cannot_be_made_ends_with_73()
    {
        var taken = folder.Write("taken", "mine");
        Assert.Equal(73, CommandLineProcess.InProcess("demo", taken).Code);
        Assert.Equal("mine", File.ReadAllText(taken));
    }

    private static string Verdict(string results)
    {
        Assert.Equal(
            ["coefficients.csv", "replicates.parquet", "result.json"], Directory.GetFiles(results).Select(f => Path.GetFileName(f)).Order(StringComparer.Ordinal));
        using var document = JsonDocument.Parse(File.ReadAllBytes(Path.Combine(results, "result.json")));
        Assert.Equal("converged", document.RootElement.GetProperty("fit").GetProperty("status").GetString());
        return document.RootElement.GetProperty("diagnostics").GetProperty("verdict").GetString()!;
    }
}
