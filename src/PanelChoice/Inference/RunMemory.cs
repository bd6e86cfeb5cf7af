using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>
/// Memory that an estimation takes for each person, cluster and occasion whatever its design takes, by what was measured of peak resident memory. Only the
/// number of refits at a time can give way: scores and Hessians of the clusters decide which way a replicate goes, and so belong to its bits.
/// </summary>
/// <param name="Fixed">Bytes taken in any case.</param>
/// <param name="ByRefit">Bytes more for each refit that is at work.</param>
internal sealed record RunMemory(long Fixed, long ByRefit)
{
    /// <summary>
    /// Of the 200 MB that a run may take beside its budget the program itself needs about 100; what is left of the others serves the panel too, with a margin.
    /// </summary>
    public const long Beside = 80_000_000;

    /// <summary>Refits at a time below which threads and reads are no longer shared in earnest.</summary>
    private const int FewestRefits = 8;

    /// <summary>Names, pseudonyms, starts, sums for each person, and sums by parameter.</summary>
    private const long ByPerson = 700, ByPersonAndParameter = 40;

    /// <summary>When a situation took place, at most twice.</summary>
    private const long BySituation = 5;

    /// <summary>What the standard errors of a design will take.</summary>
    /// <param name="design">The design.</param>
    /// <param name="settings">Bootstrap and jackknife.</param>
    public static RunMemory Of(ChoiceDesign design, InferenceSettings settings)
    {
        // Codes of a second grouping take as much as times.
        var bySituation = BySituation;
        long persons = design.Persons, clusters = design.Clusters.Length, parameters = design.Layout.Count;
        if (settings.SecondCluster is not null) bySituation *= 2;
        var sums = (persons * (ByPerson + (ByPersonAndParameter * parameters))) + (bySituation * design.Situations);
        if (settings.Replicates == 0 && !ClusterJackknife.Refits(settings.Jackknife, design.Clusters.Length)) return new RunMemory(sums, 0);
        // Twice: the collector lets go of what making them left behind only later. A refit has its draw, and weights for each person while it is at work.
        return new RunMemory(sums + (2 * sizeof(double) * ClusterExpansion.Entries(clusters, design.Layout.Free.Length, ClusterExpansion.MostEntries)), sizeof(double) * (clusters + persons));
    }

    /// <summary>Refits that may be at work at a time.</summary>
    /// <param name="budget">Bytes that the panel may take.</param>
    public int RefitsAtOnce(long budget) => ByRefit == 0 ? int.MaxValue : (int)Math.Clamp((budget + Beside - Fixed) / 2 / ByRefit, 1, int.MaxValue);

    /// <summary>Bytes that are left for blocks of the design.</summary>
    /// <param name="budget">Bytes that the panel may take.</param>
    /// <param name="threads">Threads of the run.</param>
    public long Left(long budget, int threads) =>
        Math.Max(0, budget + Beside - Fixed - (Math.Min(RefitsAtOnce(budget), NumberedRefits.BatchPerThread * threads) * ByRefit));

    /// <summary>The smallest budget that will do, in bytes.</summary>
    public long Least => Math.Max(0, Fixed + (FewestRefits * ByRefit) - Beside);
}
