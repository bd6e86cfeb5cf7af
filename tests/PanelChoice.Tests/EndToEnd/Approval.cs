using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>
/// Compares what people see with the text that was approved. With PANELCHOICE_APPROVE=1 in the environment the approved text is rewritten
/// instead; the change then shows in the diff, to be read before it is committed.
/// </summary>
internal static class Approval
{
    public static void Check(string name, string text)
    {
        var path = Path.Combine(Repository.Root, "tests", "PanelChoice.Tests", "EndToEnd", "Approved", name);
        var now = text.ReplaceLineEndings("\n");
        if (Environment.GetEnvironmentVariable("PANELCHOICE_APPROVE") == "1")
        {
            Directory.CreateDirectory(Path.GetDirectoryName(path)!);
            File.WriteAllText(path, now);
            return;
        }

        Assert.True(File.Exists(path), $"Nothing is approved yet as {name}; run the test with PANELCHOICE_APPROVE=1 and read what it writes.");
        Assert.Equal(File.ReadAllText(path).ReplaceLineEndings("\n"), now);
    }
}
