using System.Globalization;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>From a file to the design: processor time and memory, each file in a process of its own.</summary>
internal static class LoadingRows
{
    private const int Repetitions = 3;
    private const long RoomBesides = 200_000_000;

    /// <summary>Measures CSV and Parquet.</summary>
    public static void Run(CommuteShape shape)
    {
        using var folder = new ScratchFolder();
        var made = CommuteCase.Make(shape, isRounded: true);
        var files = new CommuteFiles(made);
        files.WriteCsv(folder.File("trips.csv"));
        files.WriteParquet(folder.File("trips.parquet"));
        var work = new CaseAtWork(made);
        var pass = Measurement.OfThread(Repetitions, () => work.GradientPass())[0];
        foreach (var table in new[] { "trips.csv", "trips.parquet" })
        {
            var study = folder.File($"{table}.toml");
            files.WriteStudy(study, table, replicates: 0);
            var loads = Enumerable.Range(0, Repetitions).Select(_ => ChildProcess.Benchmarks(new Dictionary<string, string>(), "load", study)).ToArray();
            double[] seconds = [.. loads.Select(l => double.Parse(l.Output.Split(' ')[0], CultureInfo.InvariantCulture))];
            var store = long.Parse(loads[0].Output.Split(' ')[1], CultureInfo.InvariantCulture);
            var peak = loads.Max(l => l.PeakBytes);
            RatioTable.Row("", $"{table} into the design, in a new process / gradient pass", $"{shape.Name} coded", seconds, pass);
            RatioTable.Row(
                "", "peak memory of that process beyond 200 MB / column store, in MB", $"{shape.Name} coded", $"{peak / 1e6:#,0.0}", $"{store / 1e6:#,0.0}",
                Spread.Of(loads.Select(l => Math.Max(0, l.PeakBytes - RoomBesides) / (double)store)), Goal.AtMost(1.5));
            RatioTable.Remark($"the file {new FileInfo(folder.File(table)).Length / 1e6:#,0.0} MB, {shape.Situations * shape.Alternatives:#,0} rows");
            Agreement.Holds(store == work.Design.Store.Bytes, $"{table} gives a column store of {store} bytes, the case itself one of {work.Design.Store.Bytes}");
        }
    }

    /// <summary>In the process of its own: loads a study's panel, says the thread's seconds and the bytes of the column store.</summary>
    public static void Load(string path)
    {
        var from = ThreadClock.Seconds();
        var study = StudyFileReader.Read(path).Value!;
        using var sample = PanelAnalysisSample.Read(study, WorkContext.Quiet).Value!;
        Console.WriteLine($"{ThreadClock.Seconds() - from:R} {sample.Design.Store.Bytes}");
    }
}
