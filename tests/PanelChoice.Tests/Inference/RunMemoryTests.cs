using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Results;
using PanelChoice.Study;
using PanelChoice.Tests.EndToEnd;
using Xunit;

namespace PanelChoice.Tests.Inference;

/// <summary>What an estimation from a store takes besides its design: counted, bounded by fewer refits at a time, or told before the run.</summary>
public sealed class RunMemoryTests : IDisposable
{
    private readonly SmallStudy small = new();
    private readonly StudySpecification study;

    public RunMemoryTests() => study = StudyFileReader.Read(small.StudyFile).Value!;

    public void Dispose() => small.Dispose();

    [Fact]
    public void Scores_and_hessians_of_clusters_count_where_anything_is_refitted()
    {
        using var sample = PanelAnalysisSample.Read(study, WorkContext.Quiet).Value!;
        var none = RunMemory.Of(sample.Design, study.Inference with { Replicates = 0, Jackknife = JackknifeKind.Off });
        var some = RunMemory.Of(sample.Design, study.Inference with { Replicates = 1, Jackknife = JackknifeKind.Off });
        // 16 clusters, 6 free parameters: 6 scores and 21 entries of a symmetric matrix each, held once and counted twice.
        Assert.Equal(6, sample.Design.Layout.Free.Length);
        Assert.Equal((2 * 8 * 16 * (6 + 21), 0L, 8L * 32), (some.Fixed - none.Fixed, none.ByRefit, some.ByRefit));
    }

    [Fact]
    public void Little_memory_means_fewer_refits_at_a_time_and_none_means_none()
    {
        var memory = new RunMemory(RunMemory.Beside, 1_000_000);
        Assert.Equal(8_000_000, memory.Least);
        Assert.Equal(4, memory.RefitsAtOnce(memory.Least));
        Assert.Equal(50, memory.RefitsAtOnce(100_000_000));
        Assert.Equal(100_000_000 - 32_000_000, memory.Left(100_000_000, 1));
        Assert.Equal(100_000_000 - 50_000_000, memory.Left(100_000_000, 4));
        Assert.Equal(0, memory.Left(0, 1));
        Assert.Equal(0, new RunMemory(1_000, 8).Least);
    }

    [Fact]
    public void No_byte_of_a_result_depends_on_how_many_refits_are_at_work_at_a_time()
    {
        using var sample = PanelAnalysisSample.Read(study, WorkContext.Quiet).Value!;
        var fit = PanelAnalysis.Fit(study, sample, WorkContext.Quiet);
        var results = new[] { 1, 7, int.MaxValue }
            .Select(most => ResultJson.Bytes(PanelAnalysis.Conclude(fit with { Evidence = fit.Evidence with { RefitsAtOnce = most } }, WorkContext.Quiet))).ToList();
        Assert.Equal(results[2], results[0]);
        Assert.Equal(results[2], results[1]);
    }

    [Fact]
    public void A_budget_that_cannot_hold_the_sums_is_told_before_the_run_with_the_figure_that_will_do()
    {
        // No panel of a test is so large: the budget lies below nothing instead.
        using var sample = PanelAnalysisSample.Keep(study, small.PathOf("kept.store"), -1, WorkContext.Quiet).Value!;
        var problem = Assert.Single(sample.Estimate<AnalysisResult>(() => throw new InvalidOperationException("It ran.")).Problems);
        Assert.Equal("store.little_memory", problem.Id);
        Assert.Contains("the sums over 16 persons do not fit into a budget of", problem.Sentence, StringComparison.Ordinal);
        Assert.EndsWith("give --memory 0 or more.", problem.Sentence, StringComparison.Ordinal);
    }
}
