using PanelChoice.Results;
using PanelChoice.Results.Refits;
using PanelChoice.Study;

namespace PanelChoice.Cli.Commands;

/// <summary>Joins the parts of a study's refits and does the rest of the main job.</summary>
internal static class GatherCommand
{
    /// <summary>Runs it.</summary>
    /// <param name="folder">Folder of the parts.</param>
    /// <param name="study">The study file; null for the one the parts name.</param>
    /// <param name="output">Folder for the result's files; null for the folder of the parts.</param>
    /// <param name="strict">Whether a flagged dependence ends with its own code.</param>
    /// <param name="kept">The store that the design is kept in; null for memory.</param>
    /// <param name="options">What every command takes.</param>
    public static int Run(string folder, string? study, string? output, bool strict, KeptDesign? kept, RunOptions options)
    {
        if (!KernelChoice.IsToBeHad(options)) return ExitCode.Usage;
        var read = GatheredParts.Read(folder);
        if (read.Value is not { } parts) return StudyRun.Reject(options, read.Problems);
        if (study is null && !File.Exists(parts.StudyFile))
            return StudyRun.Reject(
                options, [new Problem("study.not_found", parts.StudyFile, "the parts name this study file, which is not there", "name it with --study FILE")]);
        output ??= folder;
        return StudyRun.With(
            study ?? parts.StudyFile, options,
            specification =>
            {
                EstimateCommand.Probe(output, specification);
                KeptDesign.RefuseInput(kept, specification);
                return ProgressDisplay.Run(
                    options, work => PanelAnalysisParts.Conclude(specification, parts, () => KeptDesign.Read(kept, specification, work), work));
            },
            (_, result) =>
            {
                OutputException.Guard(output, () => ResultFiles.Write(result, output));
                return EstimateCommand.Tell(result, output, strict, options);
            });
    }
}
