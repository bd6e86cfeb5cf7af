using System.Globalization;
using System.Text.RegularExpressions;
using PanelChoice.Cli.Report;
using PanelChoice.Findings;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>The terminal report of a small study, as approved, under three cultures.</summary>
public partial class ReportApprovalTests
{
    [Theory]
    [InlineData("invariant")]
    [InlineData("comma")]
    [InlineData("apostrophe")]
    public void The_report_reads_as_approved_whatever_the_culture(string culture)
    {
        var before = CultureInfo.CurrentCulture;
        try
        {
            CultureInfo.CurrentCulture = culture switch { "comma" => Cultures.Comma, "apostrophe" => Cultures.Apostrophe, _ => CultureInfo.InvariantCulture };
            Approval.Check("report.txt", Report(HandMadeStages.Many));
        }
        finally
        {
            CultureInfo.CurrentCulture = before;
        }
    }

    [Fact]
    public void With_few_persons_and_nothing_found_it_reads_as_approved() =>
        Approval.Check("report-few-persons.txt", Report(HandMadeStages.Fourteen with { Diagnostics = HandMadeStages.Quiet }));

    private static string Report(FindingsInput stages)
    {
        var text = EstimateReport.Of(HandMadeStages.Result(stages)).Render(styled: false);
        Assert.All(text.Split('\n'), line => Assert.True(line.Length <= Letter.Width, line));
        return Runtime().Replace(text, "on .NET");
    }

    [GeneratedRegex(@"on \.NET\s[0-9.]+")]
    private static partial Regex Runtime();
}
