using System.Text.Json;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>Persons go by pseudonyms unless their ids are asked for.</summary>
public class ShowIdsTests
{
    [Fact]
    public void Ids_are_named_only_when_asked_for_and_then_with_a_caution()
    {
        using var study = new SmallStudy(
            text => text.Replace("replicates = 19", "replicates = 0", StringComparison.Ordinal).Replace("starts = 2", "starts = 1", StringComparison.Ordinal),
            data => string.Concat(data.Split('\n', StringSplitOptions.RemoveEmptyEntries).Select((l, i) => (i == 0 ? l : "who" + l) + "\n")));
        var (masked, _) = Run(study);
        var (shown, report) = Run(study, "--show-ids");
        Assert.Contains("--show-ids", report, StringComparison.Ordinal);
        Assert.DoesNotContain("person who", File.ReadAllText(study.PathOf("masked.txt")), StringComparison.Ordinal);
        for (var i = 0; i < 10; i++)
        {
            Assert.StartsWith("person who", Person(shown, i), StringComparison.Ordinal);
            Assert.DoesNotContain("who", Person(masked, i), StringComparison.Ordinal);
        }

        Assert.Equal("refit", shown.GetProperty("clusters").GetProperty("influence_from").GetString());
        Assert.StartsWith("person who", shown.GetProperty("parameters")[0].GetProperty("influence").GetProperty("person").GetString(), StringComparison.Ordinal);
        // Nothing but names differs.
        Assert.Equal(masked.GetProperty("covariance").GetRawText(), shown.GetProperty("covariance").GetRawText());
    }

    private static string Person(JsonElement result, int i) => result.GetProperty("clusters").GetProperty("most_influential")[i].GetProperty("person").GetString()!;

    private static (JsonElement Result, string Report) Run(SmallStudy study, params string[] more)
    {
        var outcome = CommandLineProcess.InProcess(["estimate", study.StudyFile, "--out", study.PathOf("out"), .. more]);
        Assert.True(outcome.Code == 0, outcome.Error);
        var bytes = File.ReadAllBytes(Path.Combine(study.PathOf("out"), "result.json"));
        if (more.Length == 0) File.WriteAllText(study.PathOf("masked.txt"), outcome.Out + System.Text.Encoding.UTF8.GetString(bytes));
        using var document = JsonDocument.Parse(bytes);
        return (document.RootElement.Clone(), outcome.Out);
    }
}
