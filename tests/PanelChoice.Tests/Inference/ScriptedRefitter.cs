using System.Collections.Immutable;
using PanelChoice.Estimation;

namespace PanelChoice.Tests.Inference;

/// <summary>A refitter that answers by a rule, for outcomes that are rare in real fits. It remembers what it was asked.</summary>
internal sealed class ScriptedRefitter(Func<RefitRequest, RefitOutcome> answer) : IRefitter
{
    public List<RefitRequest> Asked { get; } = [];

    public static RefitOutcome Converged(params double[] parameters) => new(FitStatus.Converged, [.. parameters], -1, 1, false, null, []);

    public static RefitOutcome Failed(FitStatus status, params int[] about) => new(status, [], double.NaN, 1, true, null, [.. about]);

    public ImmutableArray<RefitOutcome> Refit(ImmutableArray<RefitRequest> batch, CancellationToken cancellation)
    {
        Asked.AddRange(batch);
        return [.. batch.Select(answer)];
    }
}
