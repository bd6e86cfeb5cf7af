using System.Collections.Immutable;
using System.Text.Json;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>How clustering two ways went.</summary>
/// <param name="Second">What the second grouping goes by.</param>
/// <param name="Clusters">Clusters of the first grouping.</param>
/// <param name="SecondClusters">Groups of the second.</param>
/// <param name="Pairs">Pairs of both that hold an occasion.</param>
/// <param name="NegativeBeforeRepair">Labels of the parameters whose variance came out negative before any repair.</param>
/// <param name="Repaired">Whether negative eigenvalues of the matrix were set to 0.</param>
/// <param name="Touched">Labels of the parameters whose variance in the matrix the repair raised.</param>
public sealed record TwoWayResult(
    string Second, int Clusters, int SecondClusters, int Pairs, ImmutableArray<string> NegativeBeforeRepair, bool Repaired, ImmutableArray<string> Touched)
{
    /// <summary>The result of a summary; null, with its reason noted, where there is none.</summary>
    internal static TwoWayResult? Of(InferenceResult inference, ImmutableArray<string> labels, ReasonBook book)
    {
        if (inference.TwoWay is not { } summary)
        {
            book.Note("two_way", ParameterEntries.KindReason(CovarianceKind.TwoWay, inference));
            return null;
        }

        return new TwoWayResult(
            summary.Second, summary.Clusters, summary.SecondClusters, summary.Pairs, Named(summary.Negative), summary.Repaired, Named(summary.Touched));

        ImmutableArray<string> Named(ImmutableArray<int> places) => [.. places.Select(p => labels[inference.Parameters[p].Parameter])];
    }

    /// <summary>Writes it.</summary>
    internal static void Write(Utf8JsonWriter json, TwoWayResult? twoWay)
    {
        if (twoWay is null)
        {
            json.WriteNull("two_way");
            return;
        }

        json.WriteObject("two_way", () =>
        {
            json.WriteString("second", twoWay.Second);
            json.WriteNumber("clusters", twoWay.Clusters);
            json.WriteNumber("clusters_second", twoWay.SecondClusters);
            json.WriteNumber("clusters_both", twoWay.Pairs);
            json.WriteArray("negative_before_repair", twoWay.NegativeBeforeRepair, json.WriteStringValue);
            json.WriteBoolean("repaired", twoWay.Repaired);
            json.WriteArray("touched", twoWay.Touched, json.WriteStringValue);
        });
    }
}
