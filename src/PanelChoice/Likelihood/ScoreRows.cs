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

    /// <summary>Rows for strips of the plan's design.</summary>
    /// <param name="plan">The plan.</param>
    /// <param name="strip">The strip.</param>
    /// <param name="surplus">Rows after the last that are there to be read, whatever stands in them.</param>
    public ScoreRows(StripPlan plan, Strip strip, int surplus)
    {
        this.plan = plan;
        this.strip = strip;
        rows = new StripRows(plan.K + surplus, plan.StripLanes);
    }

    /// <summary>Distance between rows.</summary>
    public int Stride => rows.Stride;

    /// <summary>The row of a parameter.</summary>
    public ref double Row(int parameter) => ref rows.Row(parameter);

    /// <summary>Sets the rows from what a strip's way up and down has left.</summary>
    public void Set()
    {
        for (var k = 0; k < plan.K; k++) rows.Lanes(k, strip.Lanes).Clear();
        for (var j = 0; j < plan.J; j++)
        {
            foreach (var group in plan.Leaves[j].Groups)
            {
                var loop = new ScoreLoop(plan, strip, j, rows);
                group.Run(ref loop);
            }

            foreach (var k in plan.Leaves[j].Constants) AddSlopes(j, ref rows.Row(k));
        }

        for (var m = 0; m < plan.Root; m++)
            if (plan.NodeParameter[m] is >= 0 and var parameter)
            {
                if (plan.IsScaled) AddScaled(m, ref rows.Row(parameter));
                else AddUnscaled(m, ref rows.Row(parameter));
            }
    }

    private void AddSlopes(int alternative, ref double row)
    {
        ref var g = ref strip.FlowOverSum(plan.Parent[alternative]);
        ref var e = ref strip.Power(alternative);
        ref var weight = ref strip.Weight;
        ref var chosen = ref strip.Columns.Chosen(alternative);
        var scale = Vector512.Create(strip.Scale(plan.Parent[alternative]));
        var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
        nuint mask = 0;
        for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
            (Vector512.LoadUnsafe(ref row, lane) + Slopes.OfAlternative(ref g, ref e, ref weight, Unsafe.Add(ref chosen, mask), scale, lane)).StoreUnsafe(ref row, lane);
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

    /// <summary>Adds the products of an alternative's slopes with a group's columns to the rows.</summary>
    private readonly struct ScoreLoop(StripPlan plan, Strip strip, int alternative, StripRows rows) : IColumnLoop
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
            for (var i = 0; i < TCount.Value; i += 2)
            {
                var hasTwin = i + 1 < TCount.Value;
                ref var x0 = ref columns.Held<THeld, TCount>(group, i);
                ref var x1 = ref columns.Held<THeld, TCount>(group, i + 1);
                ref var to0 = ref rows.Row(group.Parameters[i]);
                ref var to1 = ref rows.Row(group.Parameters[hasTwin ? i + 1 : i]);
                var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
                nuint mask = 0;
                for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
                {
                    var slope = Slopes.OfAlternative(ref g, ref e, ref weight, Unsafe.Add(ref chosen, mask), scale, lane);
                    Vector512.FusedMultiplyAdd(slope, THeld.Load(ref x0, lane), Vector512.LoadUnsafe(ref to0, lane)).StoreUnsafe(ref to0, lane);
                    if (hasTwin) Vector512.FusedMultiplyAdd(slope, THeld.Load(ref x1, lane), Vector512.LoadUnsafe(ref to1, lane)).StoreUnsafe(ref to1, lane);
                }
            }
        }
    }
}
