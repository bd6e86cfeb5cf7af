using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>Every kind of bad input: code 65, a clear line for each problem, no stack trace, no output file left behind.</summary>
public class BadInputTests
{
    [Theory]
    [InlineData("unknown column", "column = \"minutes\"", "column = \"hours\"", "hours")]
    [InlineData("unknown key", "starts = 2", "starst = 2", "starst")]
    [InlineData("broken syntax", "starts = 2", "starts = = 2", "study.toml, line")]
    [InlineData("wrong type", "starts = 2", "starts = \"two\"", "starts")]
    [InlineData("alternative that the data do not have", "base     = \"A\"", "base     = \"Z\"", "Z")]
    [InlineData("nest member that the data do not have", "members = [\"C\", \"D\"]", "members = [\"C\", \"Q\"]", "Q")]
    [InlineData("history rule that is not stated", "previous = \"step\"", "", "previous")]
    [InlineData("history rule for dates on whole numbers", "previous = \"step\"", "previous = \"workday\"", "workday")]
    [InlineData("not supported yet: wide layout", "layout      = \"long\"", "layout = \"wide\"", "wide")]
    [InlineData("confidence out of range", "jackknife = \"refit\"", "confidence = 95", "confidence")]
    public void A_bad_study_is_rejected(string what, string from, string to, string mentions)
    {
        Assert.Contains(from, SmallStudy.Study, StringComparison.Ordinal);
        using var study = new SmallStudy(text => text.Replace(from, to, StringComparison.Ordinal));
        Rejected(study, what, mentions);
    }

    [Theory]
    [InlineData("missing column", "who,day,mode", "whom,day,mode", "who")]
    [InlineData("number that is none", "1,1,A,", "1,1,A,maybe,1,0.5\n1,1,A,", "maybe")]
    [InlineData("no header", "who,day,mode,taken,running,minutes\n", "", "who")]
    public void A_file_that_does_not_fit_is_rejected(string what, string from, string to, string mentions)
    {
        using var study = new SmallStudy(data: text => ReplaceFirst(text, from, to));
        Rejected(study, what, mentions);
    }

    [Theory]
    [InlineData("unparsable number", 5, "twelve", "twelve")]
    [InlineData("number that is not finite", 5, "NaN", "NaN")]
    [InlineData("empty cell", 5, "", "minutes")]
    [InlineData("occasion that is no whole number", 1, "1.5", "1.5")]
    [InlineData("empty person", 0, "", "who")]
    [InlineData("chosen flag that is none", 3, "2", "taken")]
    [InlineData("offered flag that is none", 4, "yes!", "running")]
    public void A_bad_cell_is_rejected_with_its_row_and_column(string what, int column, string value, string mentions)
    {
        using var study = new SmallStudy(data: text => ChangeOfferedRow(text, cells => cells[column] = value));
        var error = Rejected(study, what, mentions);
        Assert.Contains("row ", error, StringComparison.Ordinal);
    }

    [Fact]
    public void Two_rows_for_the_same_person_occasion_and_alternative_are_rejected()
    {
        using var study = new SmallStudy(data: text => text + text.TrimEnd().Split('\n')[^1] + "\n");
        Rejected(study, "duplicate", "row ");
    }

    [Fact]
    public void An_occasion_without_a_choice_is_rejected()
    {
        using var study = new SmallStudy(data: text => ChangeFirst(text, c => c[3] == "1", c => c[3] = "0"));
        Rejected(study, "none chosen", "chosen");
    }

    [Fact]
    public void An_occasion_with_two_choices_is_rejected()
    {
        using var study = new SmallStudy(data: text => ChangeFirst(text, c => c[3] == "0" && c[4] == "1", c => c[3] = "1"));
        Rejected(study, "two chosen", "chosen");
    }

    [Fact]
    public void A_choice_that_was_not_offered_is_rejected()
    {
        using var study = new SmallStudy(data: text => ChangeFirst(text, c => c[3] == "1", c => c[4] = "0"));
        Rejected(study, "chosen but not offered", "offered");
    }

    [Theory]
    [InlineData("0", "'expansion', value '0'")]
    [InlineData("-1", "'expansion', value '-1'")]
    public void A_weight_that_is_not_positive_is_rejected(string weight, string mentions)
    {
        using var study = Weighted((row, person) => row % 4 == 0 && person == "1" ? weight : "1");
        Rejected(study, "weight", mentions);
    }

    [Fact]
    public void A_weight_that_changes_within_a_person_is_rejected()
    {
        using var study = Weighted((row, _) => row % 2 == 0 ? "1" : "2");
        Rejected(study, "weight", "weight");
    }

    [Fact]
    public void All_problems_are_told_together()
    {
        using var study = new SmallStudy(text => text
            .Replace("starts = 2", "starst = 2", StringComparison.Ordinal).Replace("jackknife = \"refit\"", "jackknife = \"sometimes\"", StringComparison.Ordinal));
        var error = Rejected(study, "two at once", "starst");
        Assert.Contains("sometimes", error, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("check")]
    [InlineData("build")]
    public void Check_and_build_reject_the_same_data(string command)
    {
        using var study = new SmallStudy(data: text => ChangeFirst(text, c => c[3] == "1", c => c[3] = "0"));
        var outcome = CommandLineProcess.InProcess(command, study.StudyFile, command == "check" ? "--json" : "--out", study.PathOf("left.csv"));
        Assert.Equal(65, outcome.Code);
        Assert.Empty(study.OtherFiles());
    }

    [Fact]
    public void A_rejected_run_leaves_an_older_result_as_it_was()
    {
        using var study = new SmallStudy(data: text => ChangeFirst(text, c => c[3] == "1", c => c[3] = "0"));
        Directory.CreateDirectory(study.PathOf("out"));
        File.WriteAllText(Path.Combine(study.PathOf("out"), "result.json"), "older");
        Assert.Equal(65, CommandLineProcess.Run(study.Folder, "estimate", "study.toml", "--out", "out").Code);
        Assert.Equal("older", File.ReadAllText(Path.Combine(study.PathOf("out"), "result.json")));
        Assert.Equal([Path.Combine(study.PathOf("out"), "result.json")], Directory.GetFileSystemEntries(study.PathOf("out")));
    }

    private static string Rejected(SmallStudy study, string what, string mentions)
    {
        var outcome = CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("out"));
        Assert.True(outcome.Code == 65, $"{what}: code {outcome.Code}, {outcome.Error}");
        Assert.Equal("", outcome.Out);
        Assert.Contains(mentions, outcome.Error, StringComparison.Ordinal);
        Assert.DoesNotContain("   at ", outcome.Error, StringComparison.Ordinal);
        Assert.DoesNotContain("Exception", outcome.Error, StringComparison.Ordinal);
        Assert.All(outcome.Error.TrimEnd().Split('\n'), line => Assert.StartsWith("panelchoice: ", line, StringComparison.Ordinal));
        Assert.Empty(study.OtherFiles());
        return outcome.Error;
    }

    private static SmallStudy Weighted(Func<int, string, string> weight) => new(
        text => text.Replace("offered     = \"running\"", "offered = \"running\"\nweight = \"expansion\"", StringComparison.Ordinal),
        text => string.Join('\n', text.TrimEnd().Split('\n').Select((line, i) => line + (i == 0 ? ",expansion" : "," + weight(i, line.Split(',')[0])))) + "\n");

    private static string ChangeOfferedRow(string text, Action<string[]> change) => ChangeFirst(text, c => c[3] == "0" && c[4] == "1", change);

    private static string ChangeFirst(string text, Func<string[], bool> which, Action<string[]> change)
    {
        var lines = text.Split('\n');
        var at = Array.FindIndex(lines, 1, line => line.Length > 0 && which(line.Split(',')));
        var cells = lines[at].Split(',');
        change(cells);
        lines[at] = string.Join(',', cells);
        return string.Join('\n', lines);
    }

    private static string ReplaceFirst(string text, string from, string to)
    {
        var at = text.IndexOf(from, StringComparison.Ordinal);
        return text[..at] + to + text[(at + from.Length)..];
    }
}
