using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Results;

/// <summary>How the bootstrap went, in the result's words.</summary>
internal static class BootstrapEntries
{
    public static BootstrapCounts Of(
        ImmutableArray<ParameterEntry> entries, InferenceSettings settings, ParameterLayout layout, InferenceResult inference, ReasonBook book)
    {
        var refusal = inference.Covariances.GetValueOrDefault(CovarianceKind.Bootstrap)?.Refusal;
        if (inference.Bootstrap is not { } b)
        {
            var none = refusal ?? "No bootstrap replicates were made.";
            foreach (var name in (string[])["scheme", "block_length", "block_length_automatic", "target", "target_coverage", "se_with_failures"])
                book.Note($"bootstrap.{name}", none);
            return new BootstrapCounts(settings.Target is null ? settings.Replicates : 0, 0, 0, []);
        }

        const string Whole = "Whole clusters are drawn.";
        if (b.BlockLength is null)
        {
            book.Note("bootstrap.block_length", Whole);
            book.Note("bootstrap.block_length_automatic", Whole);
        }

        if (b.Target is null)
        {
            const string Stated = "The study states the number of replicates.";
            book.Note("bootstrap.target", Stated);
            book.Note("bootstrap.target_coverage", Stated);
        }

        return new BootstrapCounts(b.Requested, b.Done, b.Retried, [.. b.Failures.Select(f => new FailureCount(f.Kind, f.Count))])
        {
            Scheme = b.Blocks switch
            {
                BootstrapBlocks.Moving => "moving",
                BootstrapBlocks.Calendar => "calendar",
                _ => b.Draw == BootstrapDraw.Exponential ? "clusters_exponential" : "clusters",
            },
            BlockLength = b.BlockLength,
            IsLengthAutomatic = b.BlockLength is null ? null : b.IsLengthAutomatic,
            Target = b.Target,
            TargetCoverage = b.Target is null ? null : ReplicateNumber.Coverage,
            Failures = [.. b.Failed.Select(f => new FailedReplicateResult(f.Replicate, f.Kind, Labels(f, layout)))],
            ErrorsWithFailures = WithFailures(entries, b, refusal, book),
        };
    }

    /// <summary>For each replicate the labels of what its failure is about; empty where it converged or nothing is named.</summary>
    public static ImmutableArray<string> FailedByReplicate(BootstrapSummary bootstrap, ParameterLayout layout)
    {
        var words = Enumerable.Repeat("", bootstrap.Requested).ToArray();
        foreach (var failed in bootstrap.Failed) words[failed.Replicate] = string.Join("; ", Labels(failed, layout));
        return [.. words];
    }

    private static ImmutableArray<string> Labels(FailedReplicate failed, ParameterLayout layout) => [.. failed.Parameters.Select(k => layout.Parameters[k].Label)];

    private static ImmutableArray<double?>? WithFailures(ImmutableArray<ParameterEntry> entries, BootstrapSummary b, string? refusal, ReasonBook book)
    {
        if (refusal is not null || b.ErrorsWithFailures.IsEmpty)
        {
            book.Note("bootstrap.se_with_failures", refusal ?? "Fewer than two replicates converged.");
            return null;
        }

        return
        [
            .. entries.Select((e, i) => e.Place < 0
                ? book.Number($"bootstrap.se_with_failures[{i}]", null, "The parameter is not estimated.")
                : book.Number($"bootstrap.se_with_failures[{i}]", b.ErrorsWithFailures[e.Place], "It is not finite.")),
        ];
    }
}
