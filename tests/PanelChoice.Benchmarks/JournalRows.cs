using System.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Results.Refits;

namespace PanelChoice.Benchmarks;

/// <summary>What it costs to keep refits as they are done: a batch handed to the system, and the wait for the disk.</summary>
internal static class JournalRows
{
    private const int Parameters = 20;
    private const int Batch = 64;
    private const int Batches = 200;

    /// <summary>Measures both in the folder for temporary files.</summary>
    public static void Run()
    {
        using var folder = new ScratchFolder();
        var origin = new RefitOrigin("study", "data", 1, 1, "kernel", "version", "runtime", "estimate", Parameters, 2 * Batch * Batches, 0);
        var outcome = new RefitOutcome(FitStatus.Converged, [.. Enumerable.Range(0, Parameters).Select(k => Math.Sqrt(k + 1))], -1, 4, false, null, []);
        using var journal = RefitJournal.Open(folder.File("journal"), "taken");
        journal.Begin(new RefitHeader(new RefitShare(1, 1), "study", origin));
        using var disk = new FileStream(folder.File("disk"), FileMode.Create, FileAccess.Write, FileShare.None, 0);
        var content = new byte[Batch * RefitRecords.Of(RefitSeries.Bootstrap, 0, outcome).Length];
        var (kept, waits) = (new double[Batches], new double[Batches]);
        for (var b = 0; b < Batches; b++)
        {
            var begin = Stopwatch.GetTimestamp();
            journal.Keep(RefitSeries.Bootstrap, [.. Enumerable.Range(b * Batch, Batch)], [.. Enumerable.Repeat(outcome, Batch)]);
            kept[b] = Stopwatch.GetElapsedTime(begin).TotalSeconds;
            disk.Write(content);
            begin = Stopwatch.GetTimestamp();
            disk.Flush(flushToDisk: true);
            waits[b] = Stopwatch.GetElapsedTime(begin).TotalSeconds;
        }

        RatioTable.Row("", $"a batch of {Batch} refits of {Parameters} parameters kept / waiting for the disk after one", "", kept, waits);
        RatioTable.Remark(
            $"medians: {kept.Order().ElementAt(Batches / 2) * 1e6:#,0} microseconds for a batch, {waits.Order().ElementAt(Batches / 2) * 1e6:#,0} for the disk (longest {waits.Max() * 1e3:#,0.0} ms); "
            + $"a journal waits for the disk at most every {DiskSync.Least.TotalSeconds:0} s and {1.0 / (1 + DiskSync.LeastMultiple):P0} of the time");
    }
}
