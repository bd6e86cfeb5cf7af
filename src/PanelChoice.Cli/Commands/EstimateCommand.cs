using PanelChoice.Cli.Report;
using PanelChoice.Likelihood;
using PanelChoice.Results;

namespace PanelChoice.Cli.Commands;

/// <summary>The main job: fit, standard errors side by side, diagnostics, verdict.</summary>
internal static class EstimateCommand
{
    /// <summary>Runs it.</summary>
    /// <param name="study">The study file.</param>
    /// <param name="folder">Folder for the result's files; null for none.</param>
    /// <param name="strict">Whether a flagged dependence ends with its own code.</param>
    /// <param name="options">What every command takes.</param>
    public static int Run(string study, string? folder, bool strict, RunOptions options)
    {
        var kernel = Environment.GetEnvironmentVariable(LikelihoodKernel.Variable);
        if (!LikelihoodKernel.Knows(kernel))
        {
            options.Terminal.Problem($"the environment variable {LikelihoodKernel.Variable} is '{kernel}'; set it to scalar or vector, or unset it.");
            return ExitCode.Usage;
        }

        return StudyRun.With(
            study, options,
            specification =>
            {
                // An analysis may take long: a folder that cannot be written is told before it.
                if (folder is not null)
                {
                    foreach (var name in ResultFiles.Names) OutputException.RefuseInput(Path.Combine(folder, name), specification);
                    OutputException.Guard(folder, () => ResultFiles.Probe(folder));
                }

                return ProgressDisplay.Run(options, work => PanelAnalysis.Run(specification, work));
            },
            (_, result) =>
            {
                var letter = EstimateReport.Of(result);
                if (folder is not null)
                {
                    OutputException.Guard(folder, () => ResultFiles.Write(result, folder));
                    letter.Gap().Paragraph($"Written to {folder}: {string.Join(", ", ResultFiles.Names)}.");
                }

                options.Print(letter);
                return CodeOf(result, strict);
            });
    }

    private static int CodeOf(AnalysisResult result, bool strict) =>
        !result.IsTrusted ? ExitCode.NotTrusted : strict && result.IsDependenceFlagged ? ExitCode.Flagged : ExitCode.Done;
}
