using System.Globalization;
using PanelChoice.Results.Refits;

namespace PanelChoice.Cli.Report;

/// <summary>Sentences about refits that a run keeps in the folder of its results.</summary>
internal static class KeptReport
{
    /// <summary>What a run finds of an earlier one; null where it finds nothing.</summary>
    /// <param name="found">What it found.</param>
    /// <param name="folder">The folder.</param>
    public static string? OfFound(KeptRefits found, string folder) => found.Replicates + found.Deletions == 0
        ? null
        : $"{Counts(found)} were found in {folder}, where an earlier run kept them; this one goes on from there.";

    /// <summary>What an interrupted run has done.</summary>
    /// <param name="left">What it left; null for nothing.</param>
    /// <param name="folder">The folder.</param>
    public static string OfInterrupted(KeptRefits? left, string folder) => left is null
        ? "stopped before it was done; nothing was written."
        : $"stopped before it was done; {Counts(left)} are kept in {folder}, and the same command goes on from there.";

    private static string Counts(KeptRefits kept)
    {
        var replicates = kept.ReplicatesAsked == 0 ? null : $"{Number(kept.Replicates)} of {Number(kept.ReplicatesAsked)} bootstrap replicates";
        var deletions = kept.DeletionsAsked == 0 ? null : $"{Number(kept.Deletions)} of {Number(kept.DeletionsAsked)} refits of the jackknife";
        return replicates is null ? deletions! : deletions is null ? replicates : $"{replicates} and {deletions}";
    }

    private static string Number(int n) => n.ToString("#,0", CultureInfo.InvariantCulture);
}
