using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>Utilities of a strip's alternatives: V = sum of coefficient times covariate where offered, <see cref="Strip.NotOffered"/> elsewhere.</summary>
internal static class StripUtilities
{
    private const int Tile = ChoiceDesign.TileLanes;

    /// <summary>Sets V of every alternative.</summary>
    public static void Set(StripPlan plan, Strip strip)
    {
        for (var j = 0; j < plan.J; j++)
        {
            var leaf = plan.Leaves[j];
            var constant = 0.0;
            foreach (var k in leaf.Constants) constant += strip.Theta[k];
            if (leaf.Groups.Length == 0) SetConstant(plan, strip, j, constant);
            for (var g = 0; g < leaf.Groups.Length; g++)
            {
                var loop = new UtilityLoop(strip, plan.J, j, constant, g == 0, g == leaf.Groups.Length - 1);
                leaf.Groups[g].Run(ref loop);
            }
        }
    }

    private static void SetConstant(StripPlan plan, Strip strip, int alternative, double constant)
    {
        ref var value = ref strip.Value(alternative);
        ref var offered = ref strip.Columns.Offered(alternative);
        MemoryMarshal.CreateSpan(ref value, strip.Lanes).Fill(constant);
        var (lanes, masks) = ((nuint)strip.Lanes, (nuint)plan.J);
        nuint mask = 0;
        for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
            WhereOffered(Unsafe.Add(ref offered, mask), Vector512.LoadUnsafe(ref value, lane)).StoreUnsafe(ref value, lane);
    }

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    private static Vector512<double> WhereOffered(byte mask, Vector512<double> value) =>
        Vector512.ConditionalSelect(TileMask.Lanes(mask), value, Vector512.Create(Strip.NotOffered));

    /// <summary>Adds a group's products to V; the first group starts it, the last one puts the mask on.</summary>
    private readonly struct UtilityLoop(Strip strip, int masksOfTile, int alternative, double constant, bool isFirst, bool isLast) : IColumnLoop
    {
        public void Run<THeld, TCount>(ColumnGroup group)
            where THeld : struct, IHeldAs
            where TCount : struct, IColumnCount
        {
            var columns = strip.Columns;
            ref var x0 = ref columns.Held<THeld, TCount>(group, 0);
            ref var x1 = ref columns.Held<THeld, TCount>(group, 1);
            ref var x2 = ref columns.Held<THeld, TCount>(group, 2);
            ref var x3 = ref columns.Held<THeld, TCount>(group, 3);
            ref var x4 = ref columns.Held<THeld, TCount>(group, 4);
            ref var x5 = ref columns.Held<THeld, TCount>(group, 5);
            var b0 = Coefficient<TCount>(group, 0);
            var b1 = Coefficient<TCount>(group, 1);
            var b2 = Coefficient<TCount>(group, 2);
            var b3 = Coefficient<TCount>(group, 3);
            var b4 = Coefficient<TCount>(group, 4);
            var b5 = Coefficient<TCount>(group, 5);
            ref var value = ref strip.Value(alternative);
            ref var offered = ref columns.Offered(alternative);
            var start = Vector512.Create(constant);
            var (lanes, masks) = ((nuint)strip.Lanes, (nuint)masksOfTile);
            nuint mask = 0;
            for (nuint lane = 0; lane < lanes; lane += Tile, mask += masks)
            {
                var v = isFirst ? start : Vector512.LoadUnsafe(ref value, lane);
                v = Vector512.FusedMultiplyAdd(b0, THeld.Load(ref x0, lane), v);
                if (TCount.Value > 1)
                {
                    var odd = b1 * THeld.Load(ref x1, lane);
                    if (TCount.Value > 2) v = Vector512.FusedMultiplyAdd(b2, THeld.Load(ref x2, lane), v);
                    if (TCount.Value > 3) odd = Vector512.FusedMultiplyAdd(b3, THeld.Load(ref x3, lane), odd);
                    if (TCount.Value > 4) v = Vector512.FusedMultiplyAdd(b4, THeld.Load(ref x4, lane), v);
                    if (TCount.Value > 5) odd = Vector512.FusedMultiplyAdd(b5, THeld.Load(ref x5, lane), odd);
                    v += odd;
                }

                if (isLast) v = WhereOffered(Unsafe.Add(ref offered, mask), v);
                v.StoreUnsafe(ref value, lane);
            }
        }

        private Vector512<double> Coefficient<TCount>(ColumnGroup group, int number)
            where TCount : struct, IColumnCount => Vector512.Create(number < TCount.Value ? strip.Theta[group.Parameters[number]] : 0);
    }
}
