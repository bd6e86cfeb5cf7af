using PanelChoice.Cli.Report;
using PanelChoice.Results;

namespace PanelChoice.Cli.Commands;

/// <summary>Builds the covariates, tells what they look like, and writes them.</summary>
internal static class BuildCommand
{
    /// <summary>Whether a file of this name can be written.</summary>
    /// <param name="file">The name.</param>
    public static bool Writes(string file) => CovariateFile.CanWrite(file);

    /// <summary>Runs it.</summary>
    /// <param name="study">The study file.</param>
    /// <param name="file">Where to write the covariates; null for nowhere.</param>
    /// <param name="options">What every command takes.</param>
    public static int Run(string study, string? file, RunOptions options) => StudyRun.With(
        study, options,
        specification =>
        {
            if (file is not null) OutputException.RefuseInput(file, specification);
            return ProgressDisplay.Run(options, work => PanelAnalysis.Prepare(specification, work));
        },
        (specification, input) =>
        {
            var letter = CovariateReport.Of(specification, input.Covariates);
            if (file is not null)
            {
                OutputException.Guard(file, () => CovariateFile.Write(input.Covariates, file));
                letter.Gap().Paragraph($"Written to {file}.");
            }

            options.Print(letter);
            return ExitCode.Done;
        });

    /// <summary>Builds the design of a panel larger than memory and keeps it for later runs.</summary>
    /// <param name="study">The study file.</param>
    /// <param name="kept">The store.</param>
    /// <param name="options">What every command takes.</param>
    public static int Run(string study, KeptDesign kept, RunOptions options) => StudyRun.With(
        study, options,
        specification =>
        {
            KeptDesign.RefuseInput(kept, specification);
            return ProgressDisplay.Run(options, work => KeptDesign.Read(kept, specification, work));
        },
        (specification, sample) =>
        {
            using (sample) options.Print(StoreReport.Of(specification, sample, kept.File));
            return ExitCode.Done;
        });
}
