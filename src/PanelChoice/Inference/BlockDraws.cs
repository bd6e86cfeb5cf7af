using System.Collections.Immutable;
using PanelChoice.Estimation;

namespace PanelChoice.Inference;

/// <summary>Replicates that draw blocks of occasions instead of whole clusters: what is drawn, and who refits under weights for each occasion.</summary>
/// <param name="Length">Occasions or days in a block.</param>
/// <param name="IsAutomatic">Whether the length was found from the data.</param>
/// <param name="Blocks">Blocks drawn in a replicate.</param>
/// <param name="Refitter">Refits under the weights of a replicate.</param>
/// <param name="Weights">The weights of a replicate, by its number alone.</param>
/// <param name="Obstacle">Why no block can be drawn; null when they can.</param>
internal sealed record BlockDraws(
    int Length, bool IsAutomatic, int Blocks, IRefitter? Refitter, Func<int, ImmutableArray<double>>? Weights, string? Obstacle)
{
    /// <summary>No blocks, and why.</summary>
    public static BlockDraws Refused(string reason) => new(0, false, 0, null, null, reason);
}
