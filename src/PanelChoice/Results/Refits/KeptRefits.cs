using PanelChoice.Inference;

namespace PanelChoice.Results.Refits;

/// <summary>Refits that a run which was ended before its results were written has left in their folder.</summary>
/// <param name="File">The file that keeps them.</param>
/// <param name="Replicates">Bootstrap replicates in it.</param>
/// <param name="ReplicatesAsked">Bootstrap replicates that the run needs.</param>
/// <param name="Deletions">Refits without one cluster each in it.</param>
/// <param name="DeletionsAsked">Refits without one cluster each that the run needs.</param>
public sealed record KeptRefits(string File, int Replicates, int ReplicatesAsked, int Deletions, int DeletionsAsked)
{
    /// <summary>Why a file of another run was replaced, as a sentence; null when none was.</summary>
    public string? Replaced { get; init; }

    /// <summary>Counts what a file keeps.</summary>
    internal static KeptRefits Of(string file, RefitHeader header, IEnumerable<(RefitSeries Series, int Number)> kept)
    {
        var bySeries = kept.CountBy(k => k.Series).ToDictionary();
        return new KeptRefits(
            file, bySeries.GetValueOrDefault(RefitSeries.Bootstrap), header.Replicates, bySeries.GetValueOrDefault(RefitSeries.Jackknife), header.Deletions);
    }
}
