namespace PanelChoice.Numerics;

/// <summary>
/// Splits work into chunks whose edges depend on the amount of work alone. Threads take chunks as they come, each chunk has its own
/// accumulator, and the caller adds accumulators in chunk order: the same bits for any number of threads.
/// </summary>
internal static class FixedChunks
{
    /// <summary>Number of chunks for the given number of items: 64, or fewer when there are fewer items.</summary>
    public static int Count(int items) => Math.Min(64, Math.Max(1, items));

    /// <summary>First item of a chunk; the end of the last chunk is the start of chunk <c>Count</c>.</summary>
    public static int Start(int items, int chunk) => (int)((long)items * chunk / Count(items));

    /// <summary>Adds up what the chunks came to, in their order.</summary>
    /// <param name="parts">Chunks x length, chunk by chunk.</param>
    /// <param name="length">Figures of one chunk.</param>
    public static double[] Sum(ReadOnlySpan<double> parts, int length)
    {
        var total = new double[length];
        for (var part = 0; part < parts.Length; part += length)
            for (var i = 0; i < length; i++) total[i] += parts[part + i];
        return total;
    }

    /// <summary>Runs the action for every chunk on at most the given number of threads.</summary>
    /// <param name="items">Number of items.</param>
    /// <param name="threads">Number of threads, 1 or more.</param>
    /// <param name="action">Called with chunk index, first item and the item after the last.</param>
    public static void Run(int items, int threads, Action<int, int, int> action)
    {
        var chunks = Count(items);
        if (threads <= 1 || chunks == 1)
        {
            for (var c = 0; c < chunks; c++) action(c, Start(items, c), Start(items, c + 1));
            return;
        }

        Parallel.For(0, chunks, new ParallelOptions { MaxDegreeOfParallelism = threads }, c => action(c, Start(items, c), Start(items, c + 1)));
    }
}
