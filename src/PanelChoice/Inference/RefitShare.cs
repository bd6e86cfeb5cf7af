using System.Globalization;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>One of several shares of the same work, divided by index into stretches of nearly equal length.</summary>
/// <param name="Part">Which, from 1.</param>
/// <param name="Parts">Of how many.</param>
public sealed record RefitShare(int Part, int Parts)
{
    /// <summary>Largest number of parts.</summary>
    public const int MostParts = 9999;

    /// <summary>A share as people write it, "3/16"; null where the text is none.</summary>
    /// <param name="text">The text.</param>
    public static RefitShare? Parse(string text)
    {
        ArgumentNullException.ThrowIfNull(text);
        return text.Split('/') is [var first, var second] && Whole(first, out var part) && Whole(second, out var parts)
            && part >= 1 && part <= parts && parts <= MostParts ? new RefitShare(part, parts) : null;

        static bool Whole(string digits, out int number) => int.TryParse(digits, NumberStyles.None, CultureInfo.InvariantCulture, out number);
    }

    /// <summary>First index of the share in a series of so many.</summary>
    /// <param name="count">Length of the series.</param>
    public int First(int count) => (int)((long)count * (Part - 1) / Parts);

    /// <summary>Number of indices in the share; 0 where there are more parts than indices and this one goes without.</summary>
    /// <param name="count">Length of the series.</param>
    public int Count(int count) => (int)((long)count * Part / Parts) - First(count);
}

/// <summary>The numbered refits that the standard errors of a fit rest on: what can be divided among machines.</summary>
/// <param name="Replicates">Bootstrap replicates.</param>
/// <param name="Deletions">Refits without one cluster each; 0 where the jackknife is off or of one step.</param>
/// <param name="Obstacle">Why the fit cannot be refitted at all, so that both are 0; null when it can.</param>
public sealed record RefitPlan(int Replicates, int Deletions, string? Obstacle)
{
    /// <summary>What <see cref="StandardErrors"/> will ask for.</summary>
    /// <param name="input">What is known of the fitted model.</param>
    /// <param name="settings">Jackknife and bootstrap.</param>
    public static RefitPlan Of(InferenceInput input, InferenceSettings settings)
    {
        ArgumentNullException.ThrowIfNull(input);
        ArgumentNullException.ThrowIfNull(settings);
        if (StandardErrors.Obstacle(input) is { } reason) return new RefitPlan(0, 0, reason);
        return new RefitPlan(
            ClusterBootstrap.Obstacle(input, settings) is null ? settings.Replicates : 0,
            ClusterJackknife.Refits(settings.Jackknife, input.Clusters.Length) ? input.Clusters.Length : 0,
            null);
    }

    /// <summary>Makes one share, replicates first, into the input's journal; what is kept there already is not made again.</summary>
    /// <param name="input">The fit this plan is of, with its journal.</param>
    /// <param name="settings">The same settings.</param>
    /// <param name="share">The share.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <exception cref="OperationCanceledException">Cancelled; batches that were finished are kept.</exception>
    public void Make(InferenceInput input, InferenceSettings settings, RefitShare share, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(input);
        ArgumentNullException.ThrowIfNull(settings);
        ArgumentNullException.ThrowIfNull(share);
        ArgumentNullException.ThrowIfNull(work);
        ClusterBootstrap.Replicates(input, settings.BootstrapSeed, share.First(Replicates), share.Count(Replicates), work);
        NumberedRefits.Make(
            input, RefitSeries.Jackknife, [.. Enumerable.Range(share.First(Deletions), share.Count(Deletions))],
            g => JackknifeRefits.Without(input, g), work);
    }
}
