using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>A panel of one occasion each has no ties to test and another standard error to report.</summary>
public class OneOccasionTests
{
    [Fact]
    public void The_report_shows_and_advises_the_robust_error_and_does_not_test_independence()
    {
        using var study = new SmallStudy(
            text => text
                .Replace("previous = \"step\"", "", StringComparison.Ordinal)
                .Replace("[[term]]\nname        = \"same as last time\"\nlast_choice = 1\n", "", StringComparison.Ordinal)
                .Replace("[[nest]]\nname    = \"water\"\nmembers = [\"C\", \"D\"]\n", "", StringComparison.Ordinal),
            // Every person-day becomes a person of its own.
            text => string.Join('\n', text.TrimEnd().Split('\n').Select((line, i) => i == 0 ? line : line.Split(',')[1] + "-" + line)) + "\n");
        var outcome = CommandLineProcess.InProcess("estimate", study.StudyFile);
        Assert.True(outcome.Code == 0, outcome.Error);
        Assert.Contains("robust interval", outcome.Out, StringComparison.Ordinal);
        Assert.Contains("report\n  the robust", outcome.Out.Replace("report the\n  robust", "report\n  the robust", StringComparison.Ordinal), StringComparison.Ordinal);
        Assert.Contains("Nothing to test", outcome.Out, StringComparison.Ordinal);
        Assert.DoesNotContain("the test is the detector", outcome.Out, StringComparison.Ordinal);
        Assert.DoesNotContain("clustered interval", outcome.Out, StringComparison.Ordinal);
    }
}
