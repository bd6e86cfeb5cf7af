using System.Globalization;
using System.Text.Json;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>Clusters two ways from the command line.</summary>
public class TwoWayRunTests
{
    private static string Quick(string text, string second) => text
        .Replace("replicates = 19", "replicates = 0", StringComparison.Ordinal).Replace("jackknife = \"refit\"", $"jackknife = \"off\"\nsecond_cluster = \"{second}\"", StringComparison.Ordinal)
        .Replace("starts = 2", "starts = 1", StringComparison.Ordinal).Replace("draws = 499", "draws = 99", StringComparison.Ordinal);

    /// <summary>A column more: which fortnight a day belongs to, the same on all rows of an occasion.</summary>
    private static string WithWave(string data)
    {
        var lines = data.TrimEnd('\n').Split('\n');
        return string.Concat(lines.Select((line, i) => line + (i == 0 ? ",wave" : $",w{int.Parse(line.Split(',')[1], CultureInfo.InvariantCulture) / 2}") + "\n"));
    }

    private static JsonElement Run(SmallStudy study, params string[] more)
    {
        var outcome = CommandLineProcess.InProcess(["estimate", study.StudyFile, "--out", study.PathOf("out"), .. more]);
        Assert.True(outcome.Code == 0, outcome.Error);
        using var document = JsonDocument.Parse(File.ReadAllBytes(Path.Combine(study.PathOf("out"), "result.json")));
        return document.RootElement.Clone();
    }

    [Fact]
    public void A_column_of_the_data_gives_the_same_bytes_from_memory_from_a_store_and_from_rows_in_any_order()
    {
        static string Study(string text) => Quick(text, "wave");
        using var study = new SmallStudy(Study, WithWave);
        var result = Run(study, "--threads", "1");
        var twoWay = result.GetProperty("two_way");
        Assert.Equal("wave", twoWay.GetProperty("second").GetString());
        Assert.Equal((16, 4), (twoWay.GetProperty("clusters").GetInt32(), twoWay.GetProperty("clusters_second").GetInt32()));
        Assert.InRange(twoWay.GetProperty("clusters_both").GetInt32(), 16, 64);
        Assert.NotEqual(JsonValueKind.Null, result.GetProperty("covariance").GetProperty("two_way").ValueKind);

        var stored = Run(study, "--store", study.PathOf("kept.store"), "--memory", "1", "--threads", "2");
        Assert.Equal(result.GetRawText(), stored.GetRawText());
        Assert.Equal(result.GetRawText(), Run(study, "--store", study.PathOf("kept.store")).GetRawText());
        using var turned = new SmallStudy(Study, data =>
        {
            var lines = WithWave(data).TrimEnd('\n').Split('\n');
            return lines[0] + "\n" + string.Concat(lines.Skip(1).Reverse().Select(l => l + "\n"));
        });
        Assert.Equal(result.GetProperty("covariance").GetRawText(), Run(turned).GetProperty("covariance").GetRawText());
        File.WriteAllText(study.StudyFile, File.ReadAllText(study.StudyFile).Replace("\"wave\"", "\"occasion\"", StringComparison.Ordinal));
        var other = CommandLineProcess.InProcess(["estimate", study.StudyFile, "--store", study.PathOf("kept.store")]);
        Assert.Equal(65, other.Code);
    }

    [Fact]
    public void The_report_shows_both_figures_side_by_side_within_eighty_columns()
    {
        using var study = new SmallStudy(text => Quick(text, "occasion").Replace("replicates = 0", "replicates = 5", StringComparison.Ordinal));
        var outcome = CommandLineProcess.InProcess(["estimate", study.StudyFile]);
        Assert.Equal(0, outcome.Code);
        Assert.Contains("Clustered two ways: by person and by occasion", outcome.Out, StringComparison.Ordinal);
        Assert.Contains("16 by person, 7 by occasion", string.Join(' ', outcome.Out.Split([' ', '\n'], StringSplitOptions.RemoveEmptyEntries)), StringComparison.Ordinal);
        var lines = outcome.Out.Split('\n');
        Assert.All(lines, l => Assert.True(l.Length <= 80, l));
        // No term is broken to shreds by the columns beside it.
        Assert.Contains(lines, l => l.StartsWith("  minutes ", StringComparison.Ordinal));
    }

    [Fact]
    public void Without_a_common_calendar_nothing_is_said_by_occasion_and_the_reason_stands_there()
    {
        using var study = new SmallStudy(text => Quick(text, "occasion").Replace("shared_calendar = true\n", "", StringComparison.Ordinal));
        var result = Run(study);
        Assert.Equal(JsonValueKind.Null, result.GetProperty("two_way").ValueKind);
        foreach (var path in new[] { "two_way", "covariance.two_way", "parameters[0].se.two_way" })
            Assert.Contains("shared_calendar", result.GetProperty("reasons").EnumerateArray().Single(r => r.GetProperty("path").GetString() == path).GetProperty("reason").GetString(), StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("who", "the clusters of 'cluster' again")]
    [InlineData("wawe", "did you mean 'wave'?")]
    public void A_second_grouping_that_is_none_is_a_problem(string second, string words)
    {
        using var study = new SmallStudy(text => Quick(text, second), WithWave);
        var outcome = CommandLineProcess.InProcess(["estimate", study.StudyFile]);
        Assert.Equal(65, outcome.Code);
        Assert.Contains(words, outcome.Error, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData(",w0\n", ",\n", "data.csv")]
    [InlineData(",w0\n", ",other\n", "give all rows of an occasion the same value")]
    public void A_missing_or_changing_value_is_a_problem_with_its_row(string value, string instead, string words)
    {
        using var study = new SmallStudy(text => Quick(text, "wave"), data =>
        {
            var text = WithWave(data);
            var at = text.IndexOf(value, StringComparison.Ordinal);
            return text[..at] + instead + text[(at + value.Length)..];
        });
        var outcome = CommandLineProcess.InProcess(["estimate", study.StudyFile]);
        Assert.Equal(65, outcome.Code);
        Assert.Contains("column 'wave'", outcome.Error, StringComparison.Ordinal);
        Assert.Contains("row ", outcome.Error, StringComparison.Ordinal);
        if (words != "data.csv") Assert.Contains(words, outcome.Error, StringComparison.Ordinal);
    }
}
