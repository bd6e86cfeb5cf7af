using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Cli;

/// <summary>A design that is kept in a file and read from there.</summary>
/// <param name="File">The store's file.</param>
/// <param name="Megabytes">Memory that the panel may take.</param>
internal sealed record KeptDesign(string File, int Megabytes)
{
    /// <summary>The budget where none is stated.</summary>
    public const int UsualMegabytes = 256;

    /// <summary>Reads a study's sample: into memory, or from a store, which is made first where there is none.</summary>
    /// <param name="kept">The store; null for memory.</param>
    /// <param name="study">The study.</param>
    /// <param name="work">Threads, progress, cancellation.</param>
    /// <exception cref="OutputException">The store cannot be written.</exception>
    public static Checked<PanelAnalysisSample> Read(KeptDesign? kept, StudySpecification study, WorkContext work)
    {
        if (kept is null) return PanelAnalysisSample.Read(study, work);
        return OutputException.Guard(kept.File, () => PanelAnalysisSample.Keep(study, kept.File, kept.Megabytes * 1_000_000L, work));
    }

    /// <summary>Refuses a store that would replace the study or its data.</summary>
    public static void RefuseInput(KeptDesign? kept, StudySpecification study)
    {
        if (kept is not null) OutputException.RefuseInput(kept.File, study);
    }
}
