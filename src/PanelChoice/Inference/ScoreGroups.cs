using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Estimation;
using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>
/// Sums of scores over groups of situations that cut across persons, without the scores of all situations standing side by side: the sums of some groups
/// are open at a time, and the design is read once for each such window. What is in a window depends on the panel alone, a batch of blocks is evaluated on
/// all threads, and each sum is added up in the order of situations, so that no bit depends on threads or on where the design lies.
/// </summary>
internal sealed class ScoreGroups
{
    /// <summary>Doubles of open sums in a window: 8 MB.</summary>
    public const int WindowEntries = 1 << 20;

    private const int BlocksAtOnce = 32;

    private readonly FittedModel model;
    private readonly Func<int, long> groupOf;
    private readonly int rowsAtOnce;
    private readonly int f;

    /// <summary>Groups of the situations of a model's design.</summary>
    /// <param name="model">The model.</param>
    /// <param name="groupOf">Group of each situation in the second grouping; any numbers.</param>
    /// <param name="windowEntries">Doubles of open sums in a window.</param>
    public ScoreGroups(FittedModel model, Func<int, long> groupOf, int windowEntries = WindowEntries)
    {
        this.model = model;
        this.groupOf = groupOf;
        f = model.Layout.Free.Length;
        rowsAtOnce = Math.Max(1, windowEntries / Math.Max(1, f));
    }

    /// <summary>The sums.</summary>
    /// <param name="threads">Threads; no bit depends on it.</param>
    /// <param name="products">F x F: sum of s_it s_it' over situations, which is the sum over pairs where each pair holds one situation.</param>
    public SecondSums Sums(int threads, ImmutableArray<double> products)
    {
        var (groups, byGroup) = ByGroup(threads);
        var windows = Windows();
        var pairs = windows.Sum(w => Pairs(w).Count);
        return new SecondSums(groups, pairs, Immutable(byGroup), pairs == model.Design.Situations ? products : Immutable(ByPair(windows, threads)));
    }

    private (int Groups, double[] Products) ByGroup(int threads)
    {
        var design = model.Design;
        var found = new HashSet<long>();
        for (var s = 0; s < design.Situations; s++) found.Add(groupOf(s));
        var sorted = found.Order().ToArray();
        var total = new double[f * f];
        for (var from = 0; from < sorted.Length; from += rowsAtOnce)
        {
            var window = sorted.AsSpan(from, Math.Min(rowsAtOnce, sorted.Length - from));
            var place = new Dictionary<long, int>(window.Length);
            foreach (var group in window) place.Add(group, place.Count);
            var rows = new double[place.Count * f];
            AddScores(Enumerable.Range(0, design.Blocks.Length), (_, s) => place.GetValueOrDefault(groupOf(s), -1), rows, threads);
            AddProducts(rows, total, threads);
        }

        return (sorted.Length, total);
    }

    private double[] ByPair(List<int[]> windows, int threads)
    {
        var design = model.Design;
        var total = new double[f * f];
        foreach (var window in windows)
        {
            var pairs = Pairs(window);
            var persons = window.ToHashSet();
            var blocks = window.Select(p => design.BlockOf[design.PersonStart[p]]).Distinct().Order();
            var rows = new double[pairs.Count * f];
            AddScores(
                blocks, (p, s) => persons.Contains(p) ? pairs[(design.ClusterOf[p], groupOf(s))] : -1, rows, threads);
            AddProducts(rows, total, threads);
        }

        return total;
    }

    /// <summary>Persons by cluster, cut into windows of whole clusters that have no more situations than sums may be open.</summary>
    private List<int[]> Windows()
    {
        var design = model.Design;
        var byCluster = Enumerable.Range(0, design.Persons).ToArray();
        Array.Sort(byCluster, (a, b) => design.ClusterOf[a] != design.ClusterOf[b] ? design.ClusterOf[a].CompareTo(design.ClusterOf[b]) : a.CompareTo(b));
        var windows = new List<int[]>();
        var (from, situations) = (0, 0L);
        for (var i = 0; i < byCluster.Length;)
        {
            var (end, more) = (i, 0L);
            for (; end < byCluster.Length && design.ClusterOf[byCluster[end]] == design.ClusterOf[byCluster[i]]; end++)
                more += design.PersonStart[byCluster[end] + 1] - design.PersonStart[byCluster[end]];
            if (i > from && situations + more > rowsAtOnce)
            {
                windows.Add(byCluster[from..i]);
                (from, situations) = (i, 0);
            }

            situations += more;
            i = end;
        }

        windows.Add(byCluster[from..]);
        return windows;
    }

    /// <summary>The pairs of a window's clusters in the order in which they come up, numbered.</summary>
    private Dictionary<(int Cluster, long Group), int> Pairs(int[] persons)
    {
        var design = model.Design;
        var pairs = new Dictionary<(int, long), int>();
        foreach (var p in persons)
            for (var s = design.PersonStart[p]; s < design.PersonStart[p + 1]; s++) pairs.TryAdd((design.ClusterOf[p], groupOf(s)), pairs.Count);
        return pairs;
    }

    /// <summary>Adds the weighted scores of situations to the rows that they belong to, by person and situation; one of no row is passed over.</summary>
    private void AddScores(IEnumerable<int> blocks, Func<int, int, int> rowOf, double[] rows, int threads)
    {
        var design = model.Design;
        var k = model.Layout.Count;
        var free = model.Layout.Free;
        var scores = new double[BlocksAtOnce][];
        foreach (var batch in blocks.Chunk(BlocksAtOnce))
        {
            FixedChunks.Run(batch.Length, threads, (_, first, end) =>
            {
                for (var i = first; i < end; i++)
                {
                    var block = design.Blocks[batch[i]];
                    if ((scores[i]?.Length ?? 0) < block.Situations * k) scores[i] = new double[block.Situations * k];
                    model.Likelihood.Scores(model.Parameters.AsSpan(), block, scores[i]);
                }
            });
            for (var i = 0; i < batch.Length; i++)
            {
                var block = design.Blocks[batch[i]];
                var person = design.PersonOf[block.FirstSituation];
                for (var t = 0; t < block.Situations; t++)
                {
                    var situation = block.FirstSituation + t;
                    if (situation == design.PersonStart[person + 1]) person++;
                    var row = rowOf(person, situation);
                    if (row < 0) continue;
                    for (var c = 0; c < f; c++) rows[(row * f) + c] += design.PersonWeight[person] * scores[i][(t * k) + free[c]];
                }
            }
        }
    }

    private void AddProducts(double[] rows, double[] total, int threads)
    {
        var products = Sandwich.OuterSum(rows, f, threads);
        for (var i = 0; i < total.Length; i++) total[i] += products[i];
    }

    private static ImmutableArray<double> Immutable(double[] values) => ImmutableCollectionsMarshal.AsImmutableArray(values);
}
