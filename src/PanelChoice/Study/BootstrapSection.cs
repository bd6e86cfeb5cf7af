namespace PanelChoice.Study;

/// <summary>What <c>[inference.bootstrap]</c> says about replicates besides their seed.</summary>
/// <param name="Replicates">Their number; without meaning where there is a target.</param>
/// <param name="Target">Relative distance for which the number is found; null where the number is stated.</param>
/// <param name="Blocks">What is drawn.</param>
/// <param name="Length">Length of a block; null when it is to be found.</param>
/// <param name="Draw">How clusters are weighed.</param>
internal sealed record BootstrapSection(int Replicates, double? Target, BootstrapBlocks Blocks, int? Length, BootstrapDraw Draw)
{
    private const int Default = 399;
    private const int Most = 1_000_000;
    private const double DefaultTarget = 0.05;

    /// <summary>Nearer targets ask for more replicates than the rule makes, farther ones for fewer than a standard error deserves.</summary>
    private const double NearestTarget = 0.02, FarthestTarget = 0.25;

    /// <summary>Reads the table.</summary>
    /// <param name="table">The table.</param>
    /// <param name="problems">Where problems go.</param>
    public static BootstrapSection Read(TableReader table, StudyProblems problems)
    {
        var blocks = table.Word(
            "blocks", BootstrapBlocks.Cluster, ("cluster", BootstrapBlocks.Cluster), ("moving", BootstrapBlocks.Moving), ("calendar", BootstrapBlocks.Calendar));
        var length = table.Whole("length", 1);
        var draw = table.Word("draw", BootstrapDraw.Counts, ("counts", BootstrapDraw.Counts), ("exponential", BootstrapDraw.Exponential));
        var target = table.Number("target", x => x is >= NearestTarget and <= FarthestTarget, "from 0.02 to 0.25");
        var isAutomatic = table.Peek("replicates") == "auto";
        var replicates = isAutomatic ? Default : table.Whole("replicates", 0, Most) ?? Default;
        if (blocks == BootstrapBlocks.Cluster && table.Has("length"))
            problems.Add(
                "study.needs_key", table.PlaceOf("length"), "'length' has a meaning only where blocks of occasions or days are drawn",
                "write blocks = \"moving\" or blocks = \"calendar\", or remove it");
        if (blocks != BootstrapBlocks.Cluster && draw == BootstrapDraw.Exponential)
            problems.Add(
                "study.excluded_key", table.PlaceOf("draw"), "exponential weights are for whole clusters and cannot weigh blocks of occasions or days",
                "remove draw, or write blocks = \"cluster\"");
        if (!isAutomatic && table.Has("target"))
            problems.Add(
                "study.needs_key", table.PlaceOf("target"), "'target' has a meaning only where the number of replicates is found",
                "write replicates = \"auto\" or remove it");
        return new BootstrapSection(replicates, isAutomatic ? target ?? DefaultTarget : null, blocks, length, draw);
    }
}
