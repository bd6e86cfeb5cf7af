using PanelChoice.Cli.Report;
using PanelChoice.Inference;
using PanelChoice.Results;
using PanelChoice.Results.Refits;

namespace PanelChoice.Cli.Commands;

/// <summary>Makes one part of a study's refits, to be gathered with the others.</summary>
internal static class BootstrapCommand
{
    /// <summary>Runs it.</summary>
    /// <param name="study">The study file.</param>
    /// <param name="share">Which part.</param>
    /// <param name="folder">Folder of the parts.</param>
    /// <param name="kept">The store that the design is kept in; null for memory.</param>
    /// <param name="options">What every command takes.</param>
    public static int Run(string study, RefitShare share, string folder, KeptDesign? kept, RunOptions options)
    {
        if (!KernelChoice.IsToBeHad(options)) return ExitCode.Usage;
        try
        {
            return StudyRun.With(
                study, options,
                specification =>
                {
                    OutputException.Guard(folder, () => ResultFiles.Probe(folder));
                    foreach (var name in GatheredParts.NamesOf(share)) OutputException.RefuseInput(Path.Combine(folder, name), specification);
                    KeptDesign.RefuseInput(kept, specification);
                    return OutputException.Guard(folder, () => ProgressDisplay.Run(
                        options, work => PanelAnalysisParts.Make(specification, share, folder, () => KeptDesign.Read(kept, specification, work), work)));
                },
                (specification, part) =>
                {
                    if (part.Replaces is { } damaged) options.Terminal.Problem(damaged);
                    options.Print(PartReport.Of(specification, part, folder));
                    return part.IsTrusted ? ExitCode.Done : ExitCode.NotTrusted;
                });
        }
        catch (OperationCanceledException) when (options.Cancellation.IsCancellationRequested)
        {
            options.Terminal.Problem("stopped before it was done; the refits that were finished are kept, and the same command goes on from there.");
            return ExitCode.Interrupted;
        }
    }
}
