using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// The weighted scores of a strip as rows, one for each parameter, lane beside lane, in the units in which columns are held. What they add up to is
/// <see cref="StripGradient"/>'s sums.
/// </summary>
internal sealed class ScoreRows
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly Strip strip;
    private readonly StripRows rows;

    /// <summary>For each alternative's columns, group after group, then its constants: whether it is the first to write its parameter's row.</summary>
    private readonly bool[][] isFirst;

    /// <summary>Rows that no alternative writes.</summary>
    private readonly int[] ofDissimilarity;

    /// <summary>Rows for strips of the plan's design.</summary>
    /// <param name="plan">The plan.</param>
    /// <param name="strip">The strip.</param>
    /// <param name="surplus">Rows after the last that are there to be read, whatever stands in them.</param>
    public ScoreRows(StripPlan plan, Strip strip, int surplus)
    {
        this.plan = plan;
        this.strip = strip;
        rows = new StripRows(plan.K + surplus, plan.StripLanes);
        var written = new HashSet<int>();
        isFirst = [.. plan.Leaves.Select(leaf => leaf.Groups.SelectMany(g => g.Parameters).Concat(leaf.Constants).Select(written.Add).ToArray())];
        ofDissimilarity = [.. Enumerable.Range(0, plan.K).Where(k => !written.Contains(k))];
    }

    /// <summary>Distance between rows.</summary>
    public int Stride => rows.Stride;

    /// <summary>The row of a parameter.</summary>
    public ref double Row(int parameter) => ref rows.Row(parameter);

    /// <summary>Sets the rows from what a strip's way up and down has left.</summary>
    public void Set()
    {
        foreach (var k in ofDissimilarity) rows.Lanes(k, strip.Lanes).Clear();
        for (var j = 0; j < plan.J; j++)
        {
            var (leaf, column) = (plan.Leaves[j], 0);
            foreach (var group in leaf.Groups)
            {
                var loop = new ScoreLoop(plan, strip, j, rows, isFirst[j].AsMemory(column, group.Places.Length));
                group.Run(ref loop);
                column += group.Places.Length;
            }

            foreach (var k in leaf.Constants) AddSlopes(j, ref rows.Row(k), isFirst[j][column++]);
        }

        for (var m = 0; m < plan.Root; m++)
            if (plan.NodeParameter[m] is >= 0 and var parameter)
            {
                if (plan.IsScaled) AddScaled(m, ref rows.Row(parameter));
                else AddUnscaled(m, ref rows.Row(parameter));
            }
    }

    private void AddSlopes(int alternative, ref double row, bool starts)
    {
        ref var g = ref strip.FlowOverSum(plan.Parent[alternative]);
        ref var e = ref strip.Power(alternative);
        ref var weight = ref strip.Weight;
        ref var chosen = ref strip.Columns.Chosen(alternative);
        var scale = Vector512.Create(strip.Scale(plan.Parent[alternative]));
        var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
        nuint mask = 0;
        for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
            ((starts ? Vector512<double>.Zero : Vector512.LoadUnsafe(ref row, lane)) + Slopes.OfAlternative(ref g, ref e, ref weight, Unsafe.Add(ref chosen, mask), scale, lane)).StoreUnsafe(ref row, lane);
    }

    private void AddScaled(int m, ref double row)
    {
        var ofPath = Vector512.Create(-1 / strip.Dissimilarity[m]);
        ref var flow = ref strip.Flow(m);
        ref var tilt = ref strip.Tilt(m);
        ref var path = ref strip.Path(m);
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
        {
            var sum = Vector512.FusedMultiplyAdd(ofPath, Vector512.LoadUnsafe(ref path, lane), Vector512.LoadUnsafe(ref row, lane));
            Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref flow, lane), Vector512.LoadUnsafe(ref tilt, lane), sum).StoreUnsafe(ref row, lane);
        }
    }

    private void AddUnscaled(int m, ref double row)
    {
        ref var g = ref strip.FlowOverSum(plan.Parent[plan.J + m]);
        ref var e = ref strip.Power(plan.J + m);
        ref var o = ref strip.OnPath(m);
        var scale = Vector512.Create(strip.Scale(plan.Parent[plan.J + m]));
        ref var tilt = ref strip.Tilt(m);
        for (nuint lane = 0, end = (nuint)strip.Lanes; lane < end; lane += Tile)
            Vector512.FusedMultiplyAdd(Slopes.OfNode(ref g, ref e, ref o, scale, lane), Vector512.LoadUnsafe(ref tilt, lane), Vector512.LoadUnsafe(ref row, lane)).StoreUnsafe(ref row, lane);
    }

    /// <summary>Adds the products of an alternative's slopes with a group's columns to the rows, three columns at a time.</summary>
    private readonly struct ScoreLoop(StripPlan plan, Strip strip, int alternative, StripRows rows, ReadOnlyMemory<bool> isFirst) : IColumnLoop
    {
        public void Run<THeld, TCount>(ColumnGroup group)
            where THeld : struct, IHeldAs
            where TCount : struct, IColumnCount
        {
            var columns = strip.Columns;
            ref var g = ref strip.FlowOverSum(plan.Parent[alternative]);
            ref var e = ref strip.Power(alternative);
            ref var weight = ref strip.Weight;
            ref var chosen = ref strip.Columns.Chosen(alternative);
            var scale = Vector512.Create(strip.Scale(plan.Parent[alternative]));
            var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
            for (var i = 0; i < TCount.Value; i += 3)
            {
                var count = TCount.Value - i;
                var (second, third) = (Math.Min(i + 1, TCount.Value - 1), Math.Min(i + 2, TCount.Value - 1));
                ref var x0 = ref columns.Held<THeld, TCount>(group, i);
                ref var x1 = ref columns.Held<THeld, TCount>(group, second);
                ref var x2 = ref columns.Held<THeld, TCount>(group, third);
                ref var to0 = ref rows.Row(group.Parameters[i]);
                ref var to1 = ref rows.Row(group.Parameters[second]);
                ref var to2 = ref rows.Row(group.Parameters[third]);
                var (starts0, starts1, starts2) = (isFirst.Span[i], isFirst.Span[second], isFirst.Span[third]);
                nuint mask = 0;
                for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
                {
                    var slope = Slopes.OfAlternative(ref g, ref e, ref weight, Unsafe.Add(ref chosen, mask), scale, lane);
                    Add(slope * THeld.Load(ref x0, lane), ref to0, lane, starts0);
                    if (count > 1) Add(slope * THeld.Load(ref x1, lane), ref to1, lane, starts1);
                    if (count > 2) Add(slope * THeld.Load(ref x2, lane), ref to2, lane, starts2);
                }
            }
        }

        [MethodImpl(MethodImplOptions.AggressiveInlining)]
        private static void Add(Vector512<double> product, ref double to, nuint lane, bool starts) =>
            (starts ? product : product + Vector512.LoadUnsafe(ref to, lane)).StoreUnsafe(ref to, lane);
    }
}
