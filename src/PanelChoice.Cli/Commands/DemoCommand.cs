using PanelChoice.Cli.Report;
using PanelChoice.Results;

namespace PanelChoice.Cli.Commands;

/// <summary>Writes the demonstration's panels and studies, and runs the main job on both.</summary>
internal static class DemoCommand
{
    /// <summary>Runs it.</summary>
    /// <param name="folder">Folder for everything.</param>
    /// <param name="strict">Whether a flagged dependence ends with its own code.</param>
    /// <param name="options">What every command takes.</param>
    public static int Run(string folder, bool strict, RunOptions options)
    {
        IReadOnlyList<string> studies = [];
        OutputException.Guard(folder, () => studies = DemoFiles.Write(folder));
        options.Print(new Letter().Title("Two invented panels").Paragraph(
            $"Their data and study files are in {folder}. In the first, commuters have habits and lasting tastes; in the second, neither. The two "
            + "reports below show what the same study makes of each."));
        var codes = new List<int>();
        foreach (var study in studies)
        {
            options.Print($"\n{new string('-', Letter.Width)}\n\n");
            codes.Add(EstimateCommand.Run(study, Path.ChangeExtension(study, null), strict, false, null, options));
            if (codes[^1] == ExitCode.Interrupted) return ExitCode.Interrupted;
        }

        // Both panels are told in any case. Trouble goes before an estimate not to be trusted, and that before a flag.
        return codes.FirstOrDefault(c => c is not (ExitCode.Done or ExitCode.NotTrusted or ExitCode.Flagged)) is var trouble and not 0
            ? trouble
            : codes.Contains(ExitCode.NotTrusted) ? ExitCode.NotTrusted : codes.Max();
    }
}
