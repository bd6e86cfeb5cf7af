namespace PanelChoice.Numerics;

/// <summary>How far a long step has come. Stages report it; only a command line shows it.</summary>
/// <param name="Step">The step in plain words, for example "bootstrap replicates".</param>
/// <param name="Done">Units done.</param>
/// <param name="Total">Units in all.</param>
public sealed record WorkProgress(string Step, long Done, long Total)
{
    /// <summary>How many of those done an earlier run had done already.</summary>
    public long Found { get; init; }
}

/// <summary>How a run may use the machine; none of it changes any figure.</summary>
/// <param name="Threads">Number of threads, 1 or more.</param>
/// <param name="Progress">Where progress is reported; null for nowhere.</param>
/// <param name="Cancellation">Stops the run between units of work.</param>
public sealed record WorkContext(int Threads, IProgress<WorkProgress>? Progress, CancellationToken Cancellation)
{
    /// <summary>One thread, no progress, no cancellation.</summary>
    public static WorkContext Quiet { get; } = new(1, null, CancellationToken.None);

    /// <summary>Reports progress and stops if asked to.</summary>
    /// <exception cref="OperationCanceledException">The run was cancelled.</exception>
    public void Report(string step, long done, long total) => Report(new WorkProgress(step, done, total));

    /// <summary>Reports progress and stops if asked to.</summary>
    /// <param name="progress">How far it has come.</param>
    /// <exception cref="OperationCanceledException">The run was cancelled.</exception>
    public void Report(WorkProgress progress)
    {
        Cancellation.ThrowIfCancellationRequested();
        Progress?.Report(progress);
    }
}
