using PanelChoice.Cli.Report;
using PanelChoice.Numerics;
using PanelChoice.Results;
using PanelChoice.Results.Refits;
using PanelChoice.Study;

namespace PanelChoice.Cli.Commands;

/// <summary>The main job: fit, standard errors side by side, diagnostics, verdict.</summary>
internal static class EstimateCommand
{
    /// <summary>Runs it.</summary>
    /// <param name="study">The study file.</param>
    /// <param name="folder">Folder for the result's files; null for none.</param>
    /// <param name="strict">Whether a flagged dependence ends with its own code.</param>
    /// <param name="showIds">Whether results may name persons by their ids.</param>
    /// <param name="kept">The store that the design is kept in; null for memory.</param>
    /// <param name="options">What every command takes.</param>
    public static int Run(string study, string? folder, bool strict, bool showIds, KeptDesign? kept, RunOptions options)
    {
        if (!KernelChoice.IsToBeHad(options)) return ExitCode.Usage;
        if (folder is not null) return InFolder(study, folder, strict, showIds, kept, options);
        return StudyRun.With(
            study, options,
            specification =>
            {
                KeptDesign.RefuseInput(kept, specification);
                return ProgressDisplay.Run(options, work => PanelAnalysis.Run(specification, Read(kept, specification, showIds, work), work));
            },
            (_, result) => Tell(result, null, strict, options));
    }

    private static Checked<PanelAnalysisSample> Read(KeptDesign? kept, StudySpecification study, bool showIds, WorkContext work)
    {
        var sample = KeptDesign.Read(kept, study, work);
        if (sample.Value is { } read) read.ShowsIds = showIds;
        return sample;
    }

    /// <summary>The same with results in a folder, where a run that was ended before is taken up again.</summary>
    private static int InFolder(string study, string folder, bool strict, bool showIds, KeptDesign? kept, RunOptions options)
    {
        var hasBegun = false;
        try
        {
            return StudyRun.With(
                study, options,
                specification =>
                {
                    Probe(folder, specification);
                    OutputException.RefuseInput(Path.Combine(folder, ResultFiles.Journal), specification);
                    KeptDesign.RefuseInput(kept, specification);
                    return OutputException.Guard(folder, () => ProgressDisplay.Run(options, (work, tell) => PanelAnalysisInFolder.Run(
                        specification, folder, () => Read(kept, specification, showIds, work),
                        found =>
                        {
                            hasBegun = true;
                            Tell(found, folder, options, tell);
                        },
                        work)));
                },
                (_, result) => Tell(result, folder, strict, options));
        }
        catch (OperationCanceledException) when (options.Cancellation.IsCancellationRequested)
        {
            // Before the fit nobody knows whether what lies in the folder is of any use.
            var left = hasBegun ? OutputException.Guard(folder, () => PanelAnalysisInFolder.Left(folder)) : null;
            options.Terminal.Problem(KeptReport.OfInterrupted(left, folder));
            return ExitCode.Interrupted;
        }
    }

    /// <summary>A journal that is replaced is a problem and always told; one that is gone on with is news.</summary>
    private static void Tell(KeptRefits found, string folder, RunOptions options, Action<string> tell)
    {
        if (found.Replaced is { } replaced) tell("panelchoice: " + replaced);
        if (!options.Quiet && KeptReport.OfFound(found, folder) is { } sentence) tell("panelchoice: " + sentence);
    }

    /// <summary>An analysis may take long: a folder that cannot be written is told before it.</summary>
    public static void Probe(string folder, StudySpecification study)
    {
        foreach (var name in ResultFiles.Names) OutputException.RefuseInput(Path.Combine(folder, name), study);
        OutputException.Guard(folder, () => ResultFiles.Probe(folder));
    }

    /// <summary>Prints the report of a result whose files are written, and gives the exit code.</summary>
    public static int Tell(AnalysisResult result, string? folder, bool strict, RunOptions options)
    {
        var letter = EstimateReport.Of(result);
        if (folder is not null) letter.Gap().Paragraph($"Written to {folder}: {string.Join(", ", ResultFiles.Names)}.");

        options.Print(letter);
        return CodeOf(result, strict);
    }

    private static int CodeOf(AnalysisResult result, bool strict) =>
        !result.IsTrusted ? ExitCode.NotTrusted : strict && result.IsDependenceFlagged ? ExitCode.Flagged : ExitCode.Done;
}
