using System.Text.Json;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>The bootstrap's keys from the command line to the files.</summary>
public class BootstrapTests
{
    private static SmallStudy With(string keys) => new(text => text.Replace("replicates = 19", keys, StringComparison.Ordinal));

    private static JsonElement Estimate(SmallStudy study, string folder, out string report, params string[] more)
    {
        var outcome = CommandLineProcess.InProcess(["estimate", study.StudyFile, "--out", study.PathOf(folder), .. more]);
        Assert.Equal((0, ""), (outcome.Code, outcome.Error));
        Assert.All(outcome.Out.Split('\n'), line => Assert.True(line.Length <= 80, line));
        report = outcome.Out;
        return JsonDocument.Parse(File.ReadAllBytes(Path.Combine(study.PathOf(folder), "result.json"))).RootElement;
    }

    [Fact]
    public void Every_interval_stands_in_the_report_and_the_result_with_its_error()
    {
        // The nest is given: a draw in which its dissimilarity runs away would refuse the accelerated interval.
        using var study = new SmallStudy(text => text.Replace("replicates = 19", "replicates = 199", StringComparison.Ordinal)
            .Replace("members = [\"C\", \"D\"]", "members = [\"C\", \"D\"]\ndissimilarity = 0.7", StringComparison.Ordinal));
        var parameter = Estimate(study, "out", out var report).GetProperty("parameters")[4];
        foreach (var (interval, error) in new[] { ("bootstrap_percentile", "percentile"), ("bootstrap_bca", "bca"), ("bootstrap_t", "t") })
        {
            Assert.True(parameter.GetProperty("interval").GetProperty(interval)[0].GetDouble() < parameter.GetProperty("estimate").GetDouble());
            Assert.True(parameter.GetProperty("bootstrap_errors").GetProperty(error)[1].GetDouble() > 0);
        }

        Assert.True(parameter.GetProperty("bootstrap_errors").GetProperty("se").GetDouble() > 0);
        Assert.Contains("accelerated", report, StringComparison.Ordinal);
        Assert.Contains("bootstrap-t", report, StringComparison.Ordinal);
    }

    [Fact]
    public void A_target_and_exponential_weights_are_recorded_and_threads_change_no_byte()
    {
        using var study = With("replicates = \"auto\"\ntarget = 0.2\ndraw = \"exponential\"");
        var bootstrap = Estimate(study, "one", out var report, "--threads", "1").GetProperty("bootstrap");
        Estimate(study, "two", out _, "--threads", "2");
        foreach (var file in new[] { "result.json", "coefficients.csv", "replicates.parquet" })
            Assert.Equal(File.ReadAllBytes(Path.Combine(study.PathOf("one"), file)), File.ReadAllBytes(Path.Combine(study.PathOf("two"), file)));
        Assert.Equal("clusters_exponential", bootstrap.GetProperty("scheme").GetString());
        Assert.Equal(0.2, bootstrap.GetProperty("target").GetDouble());
        Assert.Equal(0.95, bootstrap.GetProperty("target_coverage").GetDouble());
        Assert.True(bootstrap.GetProperty("requested").GetInt32() >= 49);
        Assert.Contains("Andrews and Buchinsky", report, StringComparison.Ordinal);

        var part = CommandLineProcess.InProcess("bootstrap", study.StudyFile, "--part", "1/2", "--out", study.PathOf("parts"));
        Assert.Equal(65, part.Code);
        Assert.Contains("write a number of replicates", part.Error, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("moving")]
    [InlineData("calendar")]
    public void Blocks_are_drawn_in_parts_as_on_one_machine_and_not_from_a_store(string blocks)
    {
        using var study = With($"replicates = 30\nblocks = \"{blocks}\"");
        var bootstrap = Estimate(study, "whole", out var report).GetProperty("bootstrap");
        Assert.Equal(blocks, bootstrap.GetProperty("scheme").GetString());
        Assert.True(bootstrap.GetProperty("block_length").GetInt32() >= 1);
        Assert.True(bootstrap.GetProperty("block_length_automatic").GetBoolean());
        Assert.Contains("found from the data", report, StringComparison.Ordinal);
        foreach (var part in new[] { "1/2", "2/2" })
            Assert.Equal(0, CommandLineProcess.InProcess("bootstrap", study.StudyFile, "--part", part, "--out", study.PathOf("parts")).Code);
        Assert.Equal(0, CommandLineProcess.InProcess("gather", study.PathOf("parts")).Code);
        Assert.Equal(File.ReadAllBytes(Path.Combine(study.PathOf("whole"), "result.json")), File.ReadAllBytes(Path.Combine(study.PathOf("parts"), "result.json")));
        var store = CommandLineProcess.InProcess("estimate", study.StudyFile, "--store", study.PathOf("kept.store"));
        Assert.Equal(65, store.Code);
        Assert.Contains("without a store", store.Error, StringComparison.Ordinal);
    }

    [Fact]
    public void Replicates_that_failed_are_listed_by_number_and_kind()
    {
        // With sixteen persons the dissimilarity runs to the edge of its range in a few draws.
        using var study = With("replicates = 199");
        var result = Estimate(study, "out", out var report);
        var bootstrap = result.GetProperty("bootstrap");
        var failures = bootstrap.GetProperty("failures").EnumerateArray().ToList();
        Assert.Equal(bootstrap.GetProperty("requested").GetInt32() - bootstrap.GetProperty("done").GetInt32(), failures.Count);
        Assert.NotEmpty(failures);
        Assert.All(failures, f => Assert.NotEqual("converged", f.GetProperty("kind").GetString()));
        Assert.Contains(failures, f => f.GetProperty("parameters").EnumerateArray().Any(p => p.GetString() == "water"));
        var (with, without) = (bootstrap.GetProperty("se_with_failures")[5].GetDouble(), result.GetProperty("parameters")[5].GetProperty("se").GetProperty("bootstrap").GetDouble());
        Assert.True(with > without);
        Assert.Contains("replicates failed; result.json lists which", report.Replace("\n  ", " ", StringComparison.Ordinal), StringComparison.Ordinal);
    }
}
