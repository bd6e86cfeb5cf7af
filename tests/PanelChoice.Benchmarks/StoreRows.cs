namespace PanelChoice.Benchmarks;

/// <summary>A design of four times the memory it may take, against one in memory: the whole command each time, in a process of its own.</summary>
internal static class StoreRows
{
    private const int Fold = 4;
    private const long RoomBesides = 200_000_000;

    /// <summary>Measures <c>estimate</c> without a store, on the run that makes it, and on one that finds it.</summary>
    public static void Run(CommuteShape shape)
    {
        foreach (var isRounded in new[] { true, false })
        {
            using var folder = new ScratchFolder();
            var made = CommuteCase.Make(shape, isRounded);
            var bytes = made.Design().Store.Bytes;
            var files = new CommuteFiles(made);
            files.WriteCsv(folder.File("trips.csv"));
            files.WriteStudy(folder.File("study.toml"), "trips.csv", replicates: 0);
            var budget = (int)(bytes / Fold / 1_000_000);
            var label = $"{shape.Name} {(isRounded ? "coded" : "doubles")}";

            var unsorted = new CommuteFiles(made, isByOccasion: true);
            unsorted.WriteCsv(folder.File("days.csv"));
            unsorted.WriteParquet(folder.File("days.parquet"));
            files.WriteStudy(folder.File("csv.toml"), "days.csv", replicates: 0);
            files.WriteStudy(folder.File("parquet.toml"), "days.parquet", replicates: 0);

            var memory = Estimate("memory");
            var first = Estimate("first", "--store", folder.File("trips.store"), "--memory", $"{budget}");
            var second = Estimate("second", "--store", folder.File("trips.store"), "--memory", $"{budget}");
            var csv = Unsorted("csv");
            var parquet = Unsorted("parquet");
            foreach (var (name, run) in new[]
                { ("makes the store", first), ("finds the store", second), ("makes it from unsorted rows, CSV", csv), ("makes it from unsorted rows, Parquet", parquet) })
            {
                RatioTable.Row("", $"estimate that {name}, wall time / in memory", label, [run.WallSeconds], [memory.WallSeconds]);
                RatioTable.Row(
                    "", "its peak memory / budget plus 200 MB, in MB", label, $"{run.PeakBytes / 1e6:#,0.0}", $"{budget + (RoomBesides / 1e6):#,0.0}",
                    Spread.Of([run.PeakBytes / ((budget * 1e6) + RoomBesides)]), Goal.AtMost(1));
            }

            RatioTable.Remark(
                $"{label}: design {bytes / 1e6:#,0.0} MB, budget {budget} MB; peak in memory {memory.PeakBytes / 1e6:#,0.0} MB; "
                + $"the store {new FileInfo(folder.File("trips.store")).Length / 1e6:#,0.0} MB, the table {new FileInfo(folder.File("trips.csv")).Length / 1e6:#,0.0} MB");

            ChildOutcome Estimate(string name, params string[] more) => Run("study", name, "memory", more);

            // Files and studies differ, so that their hashes in the result do; a run in memory on the same file is what the bytes are held against.
            ChildOutcome Unsorted(string format)
            {
                Run(format, $"{format}-memory", $"{format}-memory");
                return Run(format, $"{format}-kept", $"{format}-memory", "--store", folder.File($"{format}.store"), "--memory", $"{budget}");
            }

            ChildOutcome Run(string study, string name, string same, params string[] more)
            {
                var run = ChildProcess.CommandLine(["estimate", folder.File($"{study}.toml"), "--out", folder.File(name), "--threads", "1", .. more]);
                Agreement.Holds(run.Code == 0, $"{label}: estimate ended with {run.Code}");
                Agreement.Holds(Result(name).AsSpan().SequenceEqual(Result(same)), $"{label}: a store changed the result");
                return run;
            }

            byte[] Result(string name) => File.ReadAllBytes(Path.Combine(folder.File(name), "result.json"));
        }
    }
}
