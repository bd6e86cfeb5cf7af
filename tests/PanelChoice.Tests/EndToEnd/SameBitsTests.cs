using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>Equal inputs give equal bytes, whatever the number of threads and however often.</summary>
public class SameBitsTests
{
    [Fact]
    public void Result_and_coefficients_are_the_same_bytes_for_one_and_two_threads_and_on_a_second_run()
    {
        using var study = new SmallStudy();
        var first = Files(study, "first", "1");
        var second = Files(study, "second", "2");
        var third = Files(study, "third", "1");
        Assert.Equal(first, second);
        Assert.Equal(first, third);
    }

    [Fact]
    public void The_order_of_rows_in_the_data_changes_no_figure()
    {
        using var study = new SmallStudy();
        using var shuffled = new SmallStudy(data: text =>
        {
            var lines = text.TrimEnd().Split('\n');
            return string.Join('\n', lines.Take(1).Concat(lines.Skip(1).Reverse())) + "\n";
        });
        // The data file's hash differs and with it the pseudonyms; every number must not.
        Assert.Equal(Numbers(Files(study, "out", "1")), Numbers(Files(shuffled, "out", "1")));
    }

    private static string Files(SmallStudy study, string folder, string threads)
    {
        var outcome = CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf(folder), "--threads", threads, "--quiet");
        Assert.True(outcome.Code == 0, outcome.Error);
        Assert.Equal("", outcome.Out);
        return File.ReadAllText(Path.Combine(study.PathOf(folder), "result.json")) + File.ReadAllText(Path.Combine(study.PathOf(folder), "coefficients.csv"));
    }

    private static string Numbers(string files) =>
        string.Join('\n', files.Split('\n').Where(l => !l.Contains("sha256", StringComparison.Ordinal) && !l.Contains("\"person\"", StringComparison.Ordinal)
            && !l.Contains("Without ", StringComparison.Ordinal)));
}
