using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>The numbered refits that the standard errors of a fit rest on: what can be divided among machines.</summary>
/// <param name="Replicates">Bootstrap replicates; where their number is found on the way, the most that it can be.</param>
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
            ClusterBootstrap.Obstacle(input, settings) is not null ? 0
                : settings.Target is null ? settings.Replicates
                : ReplicateNumber.Most,
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
        ClusterBootstrap.Replicates(input, settings, share.First(Replicates), share.Count(Replicates), work);
        NumberedRefits.Make(
            input, RefitSeries.Jackknife, [.. Enumerable.Range(share.First(Deletions), share.Count(Deletions))],
            g => JackknifeRefits.Without(input, g), work);
    }
}
