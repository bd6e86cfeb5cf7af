using System.Text;
using PanelChoice.Study;

namespace PanelChoice.Tests.Study;

/// <summary>Study files as text, read through a temporary file that is removed at once.</summary>
internal static class StudyText
{
    /// <summary>The smallest [panel], six lines long.</summary>
    public const string Panel = """
        [panel]
        file = "p.csv"
        person = "commuter"
        occasion = "day"
        alternative = "mode"
        chosen = "taken"

        """;

    /// <summary>The smallest good study, nine lines long.</summary>
    public const string Small = Panel + """
        [[term]]
        name = "time"
        column = "minutes"

        """;

    public static Checked<StudySpecification> Read(string text) => ReadBytes(Encoding.UTF8.GetBytes(text));

    public static Checked<StudySpecification> ReadBytes(byte[] bytes)
    {
        var folder = Directory.CreateTempSubdirectory("panelchoice-study");
        try
        {
            var path = Path.Combine(folder.FullName, "study.toml");
            File.WriteAllBytes(path, bytes);
            return StudyFileReader.Read(path);
        }
        finally
        {
            folder.Delete(true);
        }
    }

    /// <summary>A study that must be good.</summary>
    public static StudySpecification Good(string text)
    {
        var read = Read(text);
        Xunit.Assert.Empty(read.Problems.Select(p => p.Sentence));
        return read.Value!;
    }
}
