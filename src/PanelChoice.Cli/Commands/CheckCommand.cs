using PanelChoice.Cli.Report;
using PanelChoice.Panels;
using PanelChoice.Results;

namespace PanelChoice.Cli.Commands;

/// <summary>Reads and checks the panel, as an estimation would, and prints its profile.</summary>
internal static class CheckCommand
{
    /// <summary>Runs it.</summary>
    /// <param name="study">The study file.</param>
    /// <param name="json">Where to write the profile; null for nowhere.</param>
    /// <param name="options">What every command takes.</param>
    public static int Run(string study, string? json, RunOptions options) => StudyRun.With(
        study, options,
        specification =>
        {
            if (json is not null) OutputException.RefuseInput(json, specification);
            return ProgressDisplay.Run(options, work => PanelAnalysis.Prepare(specification, work));
        },
        (specification, input) =>
        {
            var profile = PanelProfile.Of(specification, input.Panel);
            var letter = ProfileReport.Of(specification, profile, input);
            if (json is not null)
            {
                OutputException.Guard(json, () => ProfileJson.Write(specification, profile, input.Covariates, json));
                letter.Gap().Paragraph($"Written to {json}.");
            }

            options.Print(letter);
            return ExitCode.Done;
        });
}
