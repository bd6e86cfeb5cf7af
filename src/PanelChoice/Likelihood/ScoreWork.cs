using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// Sums over weighted scores, strip by strip: those of each person, and the products s s' over situations. A strip's scores stand as rows
/// (<see cref="ScoreRows"/>); they are never written out situation by situation. One instance is a work space: it is not for use by several threads at once.
/// </summary>
internal sealed class ScoreWork
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly Strip strip;
    private readonly StripProbabilities probabilities;
    private readonly ScoreRows scores;
    private readonly HessianSums products;
    private readonly HessianPanel panel;
    private readonly nuint[] places;

    /// <summary>A work space for the plan's design.</summary>
    public ScoreWork(StripPlan plan)
    {
        this.plan = plan;
        strip = new Strip(plan) { KeepsAll = true };
        probabilities = new StripProbabilities(plan, strip);
        scores = new ScoreRows(plan, strip, HessianPanel.BlockRows);
        products = new HessianSums(plan.K);
        places = [.. Enumerable.Range(0, plan.K).Select(k => (nuint)(k * scores.Stride))];
        panel = new HessianPanel(products, [.. Enumerable.Range(0, plan.K)], [], -1);
    }

    /// <summary>Takes over parameters.</summary>
    public void Begin(ReadOnlySpan<double> parameters) => strip.Begin(parameters);

    /// <summary>Adds a block.</summary>
    /// <param name="block">The block.</param>
    /// <param name="personWeight">One weight for each of the design's persons.</param>
    /// <param name="byPerson">To it the sums of the block's persons are added: persons x K, in the user's units.</param>
    public void AddBlock(DesignBlock block, ReadOnlySpan<double> personWeight, Span<double> byPerson)
    {
        var weights = LaneWeights.OfPersons(personWeight);
        for (var lane = 0; lane < block.Lanes; lane += strip.Lanes)
        {
            if (!strip.OpenNext(block, lane, block.Lanes, weights)) continue;
            probabilities.Up();
            probabilities.Down();
            scores.Set();
            products.AddProducts(panel, ref scores.Row(0), scores.Stride, ref scores.Row(0), places, strip.Lanes);
            AddPersons(block.FirstSituation + lane, Math.Min(block.Situations - lane, strip.Lanes), byPerson);
        }
    }

    /// <summary>Adds the products since the last time to a K x K matrix, in the user's units.</summary>
    public void Flush(Span<double> matrix) => products.Flush(1, plan.Units, matrix);

    /// <summary>Adds up the lanes of each person; persons share tiles, so that the first and the last tile count in part.</summary>
    private void AddPersons(int firstSituation, int situations, Span<double> byPerson)
    {
        var starts = plan.Design.PersonStart;
        var person = plan.Design.PersonOf[firstSituation];
        for (var from = 0; from < situations; person++)
        {
            var to = Math.Min(situations, starts[person + 1] - firstSituation);
            AddLanes(from, to, byPerson.Slice(person * plan.K, plan.K));
            from = to;
        }
    }

    private void AddLanes(int from, int to, Span<double> sums)
    {
        var first = from / Tile * Tile;
        var last = (to - 1) / Tile * Tile;
        var head = LanesBetween(from - first, to - first);
        var tail = LanesBetween(0, to - last);
        for (var k = 0; k < sums.Length; k++)
        {
            ref var row = ref scores.Row(k);
            var sum = Vector512.LoadUnsafe(ref row, (nuint)first) & head;
            for (var lane = first + Tile; lane < last; lane += Tile) sum += Vector512.LoadUnsafe(ref row, (nuint)lane);
            if (last > first) sum += Vector512.LoadUnsafe(ref row, (nuint)last) & tail;
            sums[k] += Vector512.Sum(sum) / plan.Units[k];
        }
    }

    /// <summary>All bits of the lanes from one to the one before another.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private static Vector512<double> LanesBetween(int from, int to)
    {
        var lane = Vector512.Create(0L, 1, 2, 3, 4, 5, 6, 7);
        return (Vector512.GreaterThanOrEqual(lane, Vector512.Create((long)from)) & Vector512.LessThan(lane, Vector512.Create((long)to))).AsDouble();
    }
}
