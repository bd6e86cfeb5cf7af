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

        var wholes = Enumerable.Range(0, Repetitions).Select(r => ChildProcess.CommandLine(
            "estimate", folder.File("study.toml"), "--out", folder.File($"result-{r}"), "--threads", "1")).ToArray();
        Agreement.Holds(wholes.All(w => w.Code == 0), $"estimate ended with {string.Join(", ", wholes.Select(w => w.Code))}");
        var results = Enumerable.Range(0, Repetitions).Select(r => File.ReadAllBytes(Path.Combine(folder.File($"result-{r}"), "result.json"))).ToArray();
        Agreement.Holds(results.All(r => r.AsSpan().SequenceEqual(results[0])), "two runs of estimate gave different results");

        var parts = Parts(folder.File("study.toml"));
        double[] Sums(Func<Part, double[]> of) => [.. Enumerable.Range(0, Repetitions).Select(r => parts.Sum(p => of(p)[r]))];
        RatioTable.Row(
            "9", $"estimate, whole process, {Replicates} replicates, wall time / its parts alone", $"{shape.Name} coded", [.. wholes.Select(w => w.WallSeconds)], Sums(p => p.Wall), Goal.AtMost(1.3));
        RatioTable.Row("", "the same, processor time of all the process's threads / its parts alone", $"{shape.Name} coded", [.. wholes.Select(w => w.ProcessorSeconds)], Sums(p => p.Processor));
        RatioTable.Remark($"parts in processor time, best of {Repetitions}: {string.Join(", ", parts.Select(p => $"{p.Name} {p.Processor.Min():F2} s"))}");
        RatioTable.Remark(
            $"peak resident memory {wholes.Max(w => w.PeakBytes) / 1e6:#,0} MB; the table as Parquet {new FileInfo(folder.File("trips.parquet")).Length / 1e6:F1} MB");
    }

    /// <summary>The stages of the command one after the other, each timed by itself in a process that has run them before.</summary>
    private static List<Part> Parts(string path)
    {
        var study = StudyFileReader.Read(path).Value!;
        var parts = new List<Part>();
        Round(-1);
        for (var r = 0; r < Repetitions; r++) Round(r);
        return parts;

        void Round(int repetition)
        {
            var (sample, likelihood) = Time("load", () =>
            {
                var read = PanelAnalysisSample.Read(study, WorkContext.Quiet).Value!;
                return (read, LikelihoodKernel.Create(read.Design, study.Estimate.Form, 1));
            });
            var model = Time("fit", () => MaximumLikelihood.Fit(likelihood, study.Estimate.Form, study.Estimate, WorkContext.Quiet));
            var refitter = new ClusterRefitter(model, 1);
            Time("covariances", () => StandardErrors.Compute(
                InferenceInput.From(model, refitter), study.Inference with { Replicates = 0, Jackknife = JackknifeKind.Off }, WorkContext.Quiet));
            var evidence = InferenceInput.From(model, refitter);
            var sums = evidence.Scores(1);
            Time("jackknife", () => ClusterJackknife.Estimate(evidence, sums, study.Inference.Jackknife, WorkContext.Quiet));
            Time("replicates", () => ClusterBootstrap.Estimate(evidence, study.Inference, WorkContext.Quiet));
            Time("diagnostics", () => IndependenceBattery.Run(study, sample.Sample, model, sample.Static, WorkContext.Quiet));

            T Time<T>(string name, Func<T> part)
            {
                var (wall, processor) = (Measurement.Wall(), ThreadClock.Seconds());
                var result = part();
                (wall, processor) = (Measurement.Wall() - wall, ThreadClock.Seconds() - processor);
                if (repetition < 0)
                {
                    parts.Add(new Part(name, new double[Repetitions], new double[Repetitions]));
                    return result;
                }

                var timed = parts.First(p => p.Name == name);
                (timed.Wall[repetition], timed.Processor[repetition]) = (wall, processor);
                return result;
            }
        }
    }

    /// <summary>Seconds of a stage, repetition by repetition.</summary>
    private sealed record Part(string Name, double[] Wall, double[] Processor);
}
