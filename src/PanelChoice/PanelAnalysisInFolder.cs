using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Results;
using PanelChoice.Results.Refits;
using PanelChoice.Study;

namespace PanelChoice;

/// <summary>The main job with its results in a folder: until they are there, refits are kept in it as they are done, so that a run that was ended is taken up again.</summary>
public static class PanelAnalysisInFolder
{
    /// <summary>Does the main job and writes its files. Refits that an earlier run of the same left in the folder are not made again; the files have the same bytes.</summary>
    /// <param name="study">The study.</param>
    /// <param name="folder">The folder of the results; it is made when it does not exist.</param>
    /// <param name="read">Reads the sample; it is let go of at the end.</param>
    /// <param name="begun">Told once, before the first refit, what was found in the folder; null for nobody.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <returns>The result, or every problem found with the data, with the sample's store, or with a file in the place of the journal.</returns>
    /// <exception cref="IOException">The folder cannot be written, or another run is at work on it.</exception>
    /// <exception cref="UnauthorizedAccessException">The folder may not be written.</exception>
    /// <exception cref="OperationCanceledException">Cancelled; refits that were finished are kept.</exception>
    public static Checked<AnalysisResult> Run(
        StudySpecification study, string folder, Func<Checked<PanelAnalysisSample>> read, Action<KeptRefits>? begun, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentException.ThrowIfNullOrWhiteSpace(folder);
        ArgumentNullException.ThrowIfNull(read);
        ArgumentNullException.ThrowIfNull(work);
        return read().Then(sample =>
        {
            using (sample) return sample.Estimate(() =>
            {
                var fit = PanelAnalysis.Fit(study, sample, work);
                var origin = PanelAnalysisParts.OriginOf(fit, RefitPlan.Of(fit.Evidence, study.Inference));
                return RunJournal.Open(folder, RefitHeader.Of(new RefitShare(1, 1), folder, study.File, origin)).Then(journal =>
                {
                    using (journal)
                    {
                        begun?.Invoke(journal.Found);
                        var result = PanelAnalysis.Conclude(fit with { Evidence = fit.Evidence with { Journal = journal.Refits } }, work);
                        ResultFiles.RemoveLeftovers(folder);
                        ResultFiles.Write(result, folder);
                        journal.Remove();
                        return Checked<AnalysisResult>.Good(result);
                    }
                });
            });
        });
    }

    /// <summary>What a run that was ended has left in a folder; null where there is nothing that the same run could go on from.</summary>
    /// <param name="folder">The folder.</param>
    /// <exception cref="IOException">It cannot be read, or a run is at work on it.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be read.</exception>
    public static KeptRefits? Left(string folder)
    {
        ArgumentException.ThrowIfNullOrWhiteSpace(folder);
        return RunJournal.Left(folder);
    }
}
