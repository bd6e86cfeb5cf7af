using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Results;
using PanelChoice.Results.Refits;
using PanelChoice.Study;

namespace PanelChoice;

/// <summary>The same run divided among machines: each makes a part of the refits, one gathers them and does the rest.</summary>
public static class PanelAnalysisParts
{
    /// <summary>Makes one part of an analysis' refits and leaves it in a folder. Refits that an earlier run left there are not made again.</summary>
    /// <param name="study">The study.</param>
    /// <param name="share">Which part.</param>
    /// <param name="folder">The folder of the parts; it is made when it does not exist.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <returns>What was made, or every problem found with the data or with a file that stands in the part's place.</returns>
    /// <exception cref="IOException">The folder cannot be written, or another run is at work on the same part.</exception>
    /// <exception cref="UnauthorizedAccessException">The folder may not be written.</exception>
    /// <exception cref="OperationCanceledException">Cancelled; refits that were finished are kept.</exception>
    public static Checked<PanelAnalysisPart> Make(StudySpecification study, RefitShare share, string folder, WorkContext work) =>
        Make(study, share, folder, () => PanelAnalysisSample.Read(study, work), work);

    /// <summary>The same on a sample that is read when it is needed: a part that is complete is recognised without it.</summary>
    /// <param name="study">The study.</param>
    /// <param name="share">Which part.</param>
    /// <param name="folder">The folder of the parts; it is made when it does not exist.</param>
    /// <param name="read">Reads the sample.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <returns>What was made, or every problem found with the data, with the sample's store, or with a file that stands in the part's place.</returns>
    /// <exception cref="IOException">The folder cannot be written, or another run is at work on the same part.</exception>
    /// <exception cref="UnauthorizedAccessException">The folder may not be written.</exception>
    /// <exception cref="OperationCanceledException">Cancelled; refits that were finished are kept.</exception>
    public static Checked<PanelAnalysisPart> Make(
        StudySpecification study, RefitShare share, string folder, Func<Checked<PanelAnalysisSample>> read, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(share);
        ArgumentException.ThrowIfNullOrWhiteSpace(folder);
        ArgumentNullException.ThrowIfNull(read);
        ArgumentNullException.ThrowIfNull(work);
        if (study.Inference.Target is not null)
            return Checked<PanelAnalysisPart>.Bad(
            [
                new Problem(
                    "parts.replicates", study.File,
                    "replicates = \"auto\" finds its number from the replicates themselves, so that the parts cannot be divided beforehand",
                    "write a number of replicates, for example the one that an earlier result has found"),
            ]);
        if (Finished(study, share, folder) is { } finished) return Checked<PanelAnalysisPart>.Good(finished);
        return With(read(), sample =>
        {
            var fit = PanelAnalysis.Fit(study, sample, work);
            var plan = RefitPlan.Of(fit.Evidence, study.Inference);
            Directory.CreateDirectory(folder);
            var header = RefitHeader.Of(share, folder, study.File, OriginOf(fit, plan));
            return PartJournal.Open(folder, header).Then(journal =>
            {
                using (journal)
                {
                    if (journal.Refits is { } refits) plan.Make(fit.Evidence with { Journal = refits }, study.Inference, share, work);
                    journal.Complete();
                    return Checked<PanelAnalysisPart>.Good(new PanelAnalysisPart(
                        share, plan, journal.File, journal.Found, journal.Refits is null, journal.Replaces, fit.Model.Status == FitStatus.Converged));
                }
            });
        });
    }

    /// <summary>
    /// A part that is complete already, known by its seals and by what is written at its head: all that its refits depend on follows from study, data, seeds,
    /// kernel, version and runtime, so that the fit, which only repeats the rest of the head, need not be made. Null where there is none, or where only a fit
    /// can tell what became of it; the gathering compares everything in any case.
    /// </summary>
    private static PanelAnalysisPart? Finished(StudySpecification study, RefitShare share, string folder)
    {
        if (PartJournal.Finished(folder, share) is not { Header.Origin: { } there } file || there.Replicates + there.Deletions == 0) return null;
        if (there.GivenBy(study, there.Data) != there || Data.FileStamp.Sha256Of(study) != there.Data) return null;
        // Only a fit at a maximum is refitted.
        return new PanelAnalysisPart(share, new RefitPlan(there.Replicates, there.Deletions, null), file.Path, file.Outcomes.Count, true, null, true);
    }

    private static Checked<T> With<T>(Checked<PanelAnalysisSample> read, Func<PanelAnalysisSample, Checked<T>> use)
        where T : class => read.Then(sample =>
    {
        using (sample) return sample.Estimate(() => use(sample));
    });

    /// <summary>Does everything else that the main job does, with the refits of the parts: the result is the same, bit for bit.</summary>
    /// <param name="study">The study that the parts were made from.</param>
    /// <param name="parts">The parts.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <returns>The result, or every problem found with the data, or why the parts do not belong to this study and machine.</returns>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static Checked<AnalysisResult> Conclude(StudySpecification study, GatheredParts parts, WorkContext work) =>
        Conclude(study, parts, () => PanelAnalysisSample.Read(study, work), work);

    /// <summary>The same on a sample that is read when it is needed.</summary>
    /// <param name="study">The study that the parts were made from.</param>
    /// <param name="parts">The parts.</param>
    /// <param name="read">Reads the sample.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <returns>The result, or every problem found with the data or the sample's store, or why the parts do not belong to this study and machine.</returns>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static Checked<AnalysisResult> Conclude(
        StudySpecification study, GatheredParts parts, Func<Checked<PanelAnalysisSample>> read, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(parts);
        ArgumentNullException.ThrowIfNull(read);
        ArgumentNullException.ThrowIfNull(work);
        if (parts.Against(study) is { } otherStudy) return Checked<AnalysisResult>.Bad([otherStudy]);
        return With(read(), sample =>
        {
            if (parts.Against(study, sample.Sample.Sha256) is { } otherData) return Checked<AnalysisResult>.Bad([otherData]);
            var fit = PanelAnalysis.Fit(study, sample, work);
            return parts.Against(study, OriginOf(fit, RefitPlan.Of(fit.Evidence, study.Inference))) is { } other
                ? Checked<AnalysisResult>.Bad([other])
                : Checked<AnalysisResult>.Good(PanelAnalysis.Conclude(fit with { Evidence = fit.Evidence with { Journal = parts } }, work));
        });
    }

    /// <summary>What the refits of a fit depend on.</summary>
    internal static RefitOrigin OriginOf(PanelAnalysisFit fit, RefitPlan plan) => RefitOrigin.Of(fit.Study, fit.Sample.Sample.Sha256, fit.Model, plan);
}

/// <summary>A part that is done.</summary>
/// <param name="Share">Which part.</param>
/// <param name="Plan">The refits of the whole analysis.</param>
/// <param name="File">The file that holds the part.</param>
/// <param name="Found">Refits that an earlier run had left there.</param>
/// <param name="WasComplete">Whether nothing had to be done.</param>
/// <param name="Replaces">What was wrong with a file that was replaced; null when none was.</param>
/// <param name="IsTrusted">Whether the fit may be trusted.</param>
public sealed record PanelAnalysisPart(
    RefitShare Share, RefitPlan Plan, string File, int Found, bool WasComplete, string? Replaces, bool IsTrusted);
