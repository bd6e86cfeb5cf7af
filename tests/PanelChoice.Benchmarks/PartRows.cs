namespace PanelChoice.Benchmarks;

/// <summary>An analysis divided into parts, against the same on one machine: the whole command each time, in a process of its own.</summary>
internal static class PartRows
{
    private const int Parts = 4;
    private const int Replicates = 500;

    /// <summary>Measures every part, the gathering, and what it costs to ask for a part that is complete.</summary>
    public static void Run(CommuteShape shape)
    {
        using var folder = new ScratchFolder();
        var files = new CommuteFiles(CommuteCase.Make(shape, isRounded: true));
        files.WriteParquet(folder.File("trips.parquet"));
        files.WriteStudy(folder.File("study.toml"), "trips.parquet", Replicates);
        var label = $"{shape.Name} coded";

        var whole = Command("estimate", folder.File("study.toml"), "--out", folder.File("whole"));
        var parts = Enumerable.Range(1, Parts).Select(Part).ToList();
        var again = Part(Parts);
        var gathered = Command("gather", folder.File("parts"));

        Row($"one of {Parts} parts of {Replicates} replicates, processor time / estimate", [.. parts.Select(p => p.ProcessorSeconds)]);
        Row("the same part once more, complete already / estimate", [again.ProcessorSeconds]);
        Row("gather, processor time / estimate", [gathered.ProcessorSeconds]);
        Row("all parts and gather, processor time / estimate", [parts.Sum(p => p.ProcessorSeconds) + gathered.ProcessorSeconds]);
        RatioTable.Remark(
            $"peak resident memory of a part {parts.Max(p => p.PeakBytes) / 1e6:#,0} MB, of gather {gathered.PeakBytes / 1e6:#,0} MB, of estimate {whole.PeakBytes / 1e6:#,0} MB; "
            + $"a part's file {new FileInfo(Path.Combine(folder.File("parts"), $"part-1-of-{Parts}.refits")).Length / 1e3:#,0} kB");
        foreach (var name in new[] { "result.json", "coefficients.csv", "replicates.parquet" })
            Agreement.Holds(
                File.ReadAllBytes(Path.Combine(folder.File("whole"), name)).AsSpan().SequenceEqual(File.ReadAllBytes(Path.Combine(folder.File("parts"), name))),
                $"{label}: {name} of the parts is not that of one machine");

        ChildOutcome Part(int part) => Command("bootstrap", folder.File("study.toml"), "--part", $"{part}/{Parts}", "--out", folder.File("parts"));

        void Row(string what, double[] seconds) => RatioTable.Row("", what, label, seconds, [.. seconds.Select(_ => whole.ProcessorSeconds)]);

        ChildOutcome Command(params string[] args)
        {
            var run = ChildProcess.CommandLine([.. args, "--threads", "1"]);
            Agreement.Holds(run.Code == 0, $"{label}: {args[0]} ended with {run.Code}");
            return run;
        }
    }
}
