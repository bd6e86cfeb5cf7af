using System.Globalization;
using System.Text;
using PanelChoice.Tests.Support;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>A study file and its data in a folder of their own: 16 persons x 8 days, four modes, one nest, a last choice.</summary>
internal sealed class SmallStudy : IDisposable
{
    private readonly TemporaryFolder folder = new();

    /// <summary>Writes both files, changed if asked for.</summary>
    public SmallStudy(Func<string, string>? study = null, Func<string, string>? data = null)
    {
        Folder = Path.GetDirectoryName(folder.PathOf("x"))!;
        DataFile = folder.Write("panel.csv", data is null ? Data.Value : data(Data.Value));
        StudyFile = folder.Write("study.toml", study is null ? Study : study(Study));
    }

    public string Folder { get; }

    public string StudyFile { get; }

    public string DataFile { get; }

    public string PathOf(string name) => folder.PathOf(name);

    /// <summary>Everything in the folder besides the study and its data.</summary>
    public IEnumerable<string> OtherFiles() =>
        Directory.EnumerateFileSystemEntries(Folder).Where(f => f != StudyFile && f != DataFile).Select(f => Path.GetFileName(f)!).Order(StringComparer.Ordinal);

    public void Dispose() => folder.Dispose();

    /// <summary>The study's text.</summary>
    public const string Study = """
        title = "A small panel"

        [panel]
        file        = "panel.csv"
        layout      = "long"
        person      = "who"
        occasion    = "day"
        alternative = "mode"
        chosen      = "taken"
        offered     = "running"
        shared_calendar = true

        [history]
        previous = "step"

        [[nest]]
        name    = "water"
        members = ["C", "D"]

        [[term]]
        name     = "constant"
        constant = true
        each     = true
        base     = "A"

        [[term]]
        name   = "minutes"
        column = "minutes"

        [[term]]
        name        = "same as last time"
        last_choice = 1

        [estimate]
        starts = 2

        [inference]
        jackknife = "refit"
        [inference.bootstrap]
        replicates = 19

        [diagnostics]
        draws = 499

        """;

    private static readonly Lazy<string> Data = new(() =>
    {
        var panel = SyntheticPanel.Make(5, 16, 8, 4, [SyntheticPanel.Nest("water", "C", "D")], [0.7], attributes: 1, habit: 0.6, tasteSd: 0.5);
        var values = panel.Covariates.Covariates.Single(c => c.Term == "attribute 1").Values;
        var text = new StringBuilder("who,day,mode,taken,running,minutes\n");
        for (var o = 0; o < panel.Panel.Occasions; o++)
            for (var j = 0; j < 4; j++)
            {
                var cell = (o * 4) + j;
                text.Append(CultureInfo.InvariantCulture, $"{panel.Panel.Persons[panel.Panel.PersonOf[o]]},{panel.Panel.Occasion[o]},{panel.Panel.Alternatives[j]},");
                text.Append(CultureInfo.InvariantCulture, $"{(panel.Panel.Chosen[o] == j ? 1 : 0)},{(panel.Panel.Offered[cell] ? 1 : 0)},{values[cell]:F4}\n");
            }

        return text.ToString();
    });
}
