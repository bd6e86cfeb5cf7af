using System.Text.Json;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>The panel's profile, for people and for machines; names of persons and households stay at home.</summary>
public class CheckTests
{
    [Fact]
    public void The_profile_is_printed_and_written()
    {
        using var study = new SmallStudy();
        var outcome = CommandLineProcess.Run(study.Folder, "check", "study.toml", "--json", "profile.json");
        Assert.Equal("", outcome.Error);
        Assert.Equal(0, outcome.Code);
        Assert.Contains("512 rows, 128 occasions, 16 persons, from 1 to 8.", outcome.Out, StringComparison.Ordinal);
        Assert.Equal(["profile.json"], study.OtherFiles());
        using var document = JsonDocument.Parse(File.ReadAllBytes(study.PathOf("profile.json")));
        var root = document.RootElement;
        Assert.Equal("panelchoice-profile/1", root.GetProperty("schema").GetString());
        var panel = root.GetProperty("panel");
        Assert.Equal(128, panel.GetProperty("occasions").GetInt32());
        // 16 persons x 7 steps from one day to the next; every transition is in the table once.
        var last = panel.GetProperty("last_choice");
        Assert.Equal(112, last.GetProperty("occasions").GetInt32());
        Assert.Equal(112, last.GetProperty("transitions").EnumerateArray().Sum(r => r.EnumerateArray().Sum(n => n.GetInt32())));
        Assert.Equal(112, root.GetProperty("sample").GetProperty("occasions").GetInt32());
    }

    [Fact]
    public void Persons_and_households_are_never_named_in_what_may_be_passed_on()
    {
        using var study = new SmallStudy(
            text => text.Replace("[inference]", "[inference]\ncluster = \"house\"", StringComparison.Ordinal),
            text => string.Join('\n', text.TrimEnd().Split('\n').Select((line, i) => i == 0 ? line + ",house" : "resident-" + line + ",villa-" + line.Split(',')[0])) + "\n");
        var outcome = CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("out"));
        Assert.True(outcome.Code == 0, outcome.Error);
        var json = File.ReadAllText(Path.Combine(study.PathOf("out"), "result.json"));
        Assert.Matches("\"person\": \"house [0-9a-f]{6}\"", json);
        foreach (var told in new[] { outcome.Out, json, File.ReadAllText(Path.Combine(study.PathOf("out"), "coefficients.csv")) })
        {
            Assert.DoesNotContain("resident-", told, StringComparison.Ordinal);
            Assert.DoesNotContain("villa-", told, StringComparison.Ordinal);
        }
    }
}
