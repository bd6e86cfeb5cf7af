using System.Collections.Immutable;
using PanelChoice.Estimation;

namespace PanelChoice.Inference;

/// <summary>Outcomes of numbered refits that outlive the run that makes them: made earlier, made elsewhere, or to be taken up again.</summary>
public interface IRefitJournal
{
    /// <summary>The outcome kept under a number; null when there is none yet.</summary>
    /// <param name="series">The series.</param>
    /// <param name="number">The number in it.</param>
    RefitOutcome? Find(RefitSeries series, int number);

    /// <summary>Keeps outcomes that have just been made; when it returns they outlive the process.</summary>
    /// <param name="series">The series.</param>
    /// <param name="numbers">Their numbers; none is kept already.</param>
    /// <param name="outcomes">One outcome for each number.</param>
    /// <exception cref="IOException">They cannot be written.</exception>
    void Keep(RefitSeries series, ImmutableArray<int> numbers, ImmutableArray<RefitOutcome> outcomes);
}
