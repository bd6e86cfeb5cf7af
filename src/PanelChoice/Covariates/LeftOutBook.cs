using System.Collections.Immutable;

namespace PanelChoice.Covariates;

/// <summary>
/// How many occasions each reason left out, over all parts of a panel. Reasons stand in the order in which one pass over the whole panel would meet
/// them: by the stage of the selection that gives them, and within a stage as they come up.
/// </summary>
internal sealed class LeftOutBook
{
    private readonly Dictionary<string, Entry> entries = new(StringComparer.Ordinal);
    private int met;

    /// <summary>The entry of a reason that a stage gives.</summary>
    /// <param name="stage">Number of the stage.</param>
    /// <param name="reason">The reason.</param>
    public Entry Of(int stage, string reason)
    {
        if (!entries.TryGetValue(reason, out var entry)) entries[reason] = entry = new Entry(stage, met++);
        else if (stage < entry.Stage) (entry.Stage, entry.Met) = (stage, met++);
        return entry;
    }

    /// <summary>The reasons that left something out.</summary>
    public ImmutableArray<LeftOut> Reasons =>
        [.. entries.Where(e => e.Value.Occasions > 0).OrderBy(e => e.Value.Stage).ThenBy(e => e.Value.Met).Select(e => new LeftOut(e.Key, e.Value.Occasions))];

    /// <summary>A reason's book-keeping.</summary>
    internal sealed class Entry(int stage, int met)
    {
        /// <summary>The first stage that gives the reason.</summary>
        public int Stage { get; set; } = stage;

        /// <summary>When that stage first gave it.</summary>
        public int Met { get; set; } = met;

        /// <summary>Occasions left out.</summary>
        public int Occasions { get; set; }
    }
}
