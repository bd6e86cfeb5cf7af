using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Estimation;
using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>Outcomes of numbered refits: those the journal has are taken from it, the others are made and kept there.</summary>
internal static class NumberedRefits
{
    /// <summary>
    /// Refits handed to the refitter at a time, for each thread: as many as can share a read of the data. Progress is told, and a run that is
    /// stopped goes back, by no more.
    /// </summary>
    public const int BatchPerThread = 32;

    /// <summary>Refits handed to the refitter at a time.</summary>
    public static int Batch(InferenceInput input, WorkContext work) => Math.Min(input.RefitsAtOnce, BatchPerThread * Math.Max(1, work.Threads));

    /// <summary>One outcome for each number, in the same order.</summary>
    /// <param name="input">The fit, the refitter and the journal.</param>
    /// <param name="series">The series.</param>
    /// <param name="numbers">Numbers in it.</param>
    /// <param name="request">What to ask the refitter for under a number.</param>
    /// <param name="work">Threads, progress, cancellation.</param>
    public static ImmutableArray<RefitOutcome> Make(
        InferenceInput input, RefitSeries series, IReadOnlyList<int> numbers, Func<int, RefitRequest> request, WorkContext work)
    {
        var step = series == RefitSeries.Bootstrap ? "bootstrap replicates" : "jackknife";
        var outcomes = new RefitOutcome?[numbers.Count];
        if (input.Journal is { } journal)
            for (var i = 0; i < outcomes.Length; i++) outcomes[i] = journal.Find(series, numbers[i]);
        var missing = Enumerable.Range(0, outcomes.Length).Where(i => outcomes[i] is null).ToList();
        var found = outcomes.Length - missing.Count;
        var done = found;
        foreach (var batch in missing.Chunk(Batch(input, work)))
        {
            work.Report(new WorkProgress(step, done, outcomes.Length) { Found = found });
            ImmutableArray<int> asked = [.. batch.Select(i => numbers[i])];
            var made = input.Refitter.Refit([.. asked.Select(request)], work.Cancellation);
            input.Journal?.Keep(series, asked, made);
            for (var i = 0; i < batch.Length; i++) outcomes[batch[i]] = made[i];
            done += batch.Length;
        }

        work.Report(new WorkProgress(step, done, outcomes.Length) { Found = found });
        return ImmutableCollectionsMarshal.AsImmutableArray(outcomes)!;
    }
}
