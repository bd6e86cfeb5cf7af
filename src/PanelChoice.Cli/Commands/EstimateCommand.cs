using PanelChoice.Cli.Report;
using PanelChoice.Results;
using PanelChoice.Study;

namespace PanelChoice.Cli.Commands;

/// <summary>The main job: fit, standard errors side by side, diagnostics, verdict.</summary>
internal static class EstimateCommand
{
    /// <summary>Runs it.</summary>
    /// <param name="study">The study file.</param>
    /// <param name="folder">Folder for the result's files; null for none.</param>
    /// <param name="strict">Whether a flagged dependence ends with its own code.</param>
    /// <param name="kept">The store that the design is kept in; null for memory.</param>
    /// <param name="options">What every command takes.</param>
    public static int Run(string study, string? folder, bool strict, KeptDesign? kept, RunOptions options)
    {
        if (!KernelChoice.IsToBeHad(options)) return ExitCode.Usage;
        return StudyRun.With(
            study, options,
            specification =>
            {
                if (folder is not null) Probe(folder, specification);
                KeptDesign.RefuseInput(kept, specification);
                return ProgressDisplay.Run(options, work => PanelAnalysis.Run(specification, KeptDesign.Read(kept, specification, work), work));
            },
            (_, result) => Tell(result, folder, strict, options));
    }

    /// <summary>An analysis may take long: a folder that cannot be written is told before it.</summary>
    public static void Probe(string folder, StudySpecification study)
    {
        foreach (var name in ResultFiles.Names) OutputException.RefuseInput(Path.Combine(folder, name), study);
        OutputException.Guard(folder, () => ResultFiles.Probe(folder));
    }

    /// <summary>Prints the report of a result, writes its files, and gives the exit code.</summary>
    public static int Tell(AnalysisResult result, string? folder, bool strict, RunOptions options)
    {
        var letter = EstimateReport.Of(result);
        if (folder is not null)
        {
            OutputException.Guard(folder, () => ResultFiles.Write(result, folder));
            letter.Gap().Paragraph($"Written to {folder}: {string.Join(", ", ResultFiles.Names)}.");
        }

        options.Print(letter);
        return CodeOf(result, strict);
    }

    private static int CodeOf(AnalysisResult result, bool strict) =>
        !result.IsTrusted ? ExitCode.NotTrusted : strict && result.IsDependenceFlagged ? ExitCode.Flagged : ExitCode.Done;
}
