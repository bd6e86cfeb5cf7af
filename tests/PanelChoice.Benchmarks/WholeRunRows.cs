using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>
/// The whole command against its parts: what start-up, compilation, copies between stages, the report and the result files add. Both run with one
/// thread and the study's default of 20 starts.
/// </summary>
internal static class WholeRunRows
{
    private const int Replicates = 500;
    private const int Repetitions = 3;

    /// <summary>Measures <c>estimate</c> on a case from Parquet.</summary>
    public static void Run(CommuteShape shape)
    {
        using var folder = new ScratchFolder();
        var files = new CommuteFiles(CommuteCase.Make(shape, isRounded: true));
        files.WriteParquet(folder.File("trips.parquet"));
        files.WriteStudy(folder.File("study.toml"), "trips.parquet", Replicates);

        var stages = new Stages(StudyFileReader.Read(folder.File("study.toml")).Value!);
        stages.Run();
        stages.Forget();
        var wholes = new List<ChildOutcome>();
        for (var r = 0; r < Repetitions; r++)
        {
            wholes.Add(ChildProcess.CommandLine("estimate", folder.File("study.toml"), "--out", folder.File($"result-{r}"), "--threads", "1"));
            stages.Run();
        }

        Agreement.Holds(wholes.All(w => w.Code == 0), $"estimate ended with {string.Join(", ", wholes.Select(w => w.Code))}");
        var results = Enumerable.Range(0, Repetitions).Select(r => File.ReadAllBytes(Path.Combine(folder.File($"result-{r}"), "result.json"))).ToArray();
        Agreement.Holds(results.All(r => r.AsSpan().SequenceEqual(results[0])), "two runs of estimate gave different results");

        double[] Sums(Func<(double Wall, double Processor), double> of) => [.. Enumerable.Range(0, Repetitions).Select(r => stages.Times.Values.Sum(t => of(t[r])))];
        RatioTable.Row(
            "9", $"estimate, whole process, {Replicates} replicates, wall time / its parts alone", $"{shape.Name} coded", [.. wholes.Select(w => w.WallSeconds)], Sums(t => t.Wall), Goal.AtMost(1.3));
        RatioTable.Row("", "the same, processor time of all the process's threads / its parts alone", $"{shape.Name} coded", [.. wholes.Select(w => w.ProcessorSeconds)], Sums(t => t.Processor));
        RatioTable.Remark(
            $"parts in processor time, best of {Repetitions}: {string.Join(", ", stages.Times.Select(t => $"{t.Key} {t.Value.Min(x => x.Processor):F2} s"))}");
        RatioTable.Remark(
            $"peak resident memory {wholes.Max(w => w.PeakBytes) / 1e6:#,0} MB; the table as Parquet {new FileInfo(folder.File("trips.parquet")).Length / 1e6:F1} MB");
    }

    /// <summary>The stages of the command one after the other, each timed by itself in a process that has run them before.</summary>
    private sealed class Stages(StudySpecification study)
    {
        /// <summary>Seconds of each stage, run by run.</summary>
        public OrderedDictionary<string, List<(double Wall, double Processor)>> Times { get; } = [];

        public void Forget() => Times.Clear();

        public void Run()
        {
            var (sample, likelihood) = Time("load", () =>
            {
                var read = PanelAnalysisSample.Read(study, WorkContext.Quiet).Value!;
                return (read, LikelihoodKernel.Create(read.Design, study.Estimate.Form, 1));
            });
            var model = Time("fit", () => MaximumLikelihood.Fit(likelihood, study.Estimate.Form, study.Estimate, WorkContext.Quiet));
            var evidence = InferenceInput.From(model, new ClusterRefitter(model, 1));
            Time("covariances", () => StandardErrors.Compute(evidence, study.Inference with { Replicates = 0, Jackknife = JackknifeKind.Off }, WorkContext.Quiet));
            var sums = evidence.Scores(1);
            Time("jackknife", () => ClusterJackknife.Estimate(evidence, sums, study.Inference.Jackknife, WorkContext.Quiet));
            Time("replicates", () => ClusterBootstrap.Estimate(evidence, study.Inference, WorkContext.Quiet));
            Time("diagnostics", () => IndependenceBattery.Run(study, sample.Sample, model, sample.Static, WorkContext.Quiet));
            sample.Dispose();
        }

        private T Time<T>(string stage, Func<T> run)
        {
            var (wall, processor) = (Measurement.Wall(), ThreadClock.Seconds());
            var result = run();
            if (!Times.TryGetValue(stage, out var times)) Times[stage] = times = [];
            times.Add((Measurement.Wall() - wall, ThreadClock.Seconds() - processor));
            return result;
        }
    }
}
