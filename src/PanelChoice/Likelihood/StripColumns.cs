using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// The columns and masks of a strip where they stand in the block's bytes; loops over a <see cref="ColumnGroup"/> turn whole numbers into doubles
/// as they read. For what reads a column many times they can be had as doubles: those held as whole numbers are then unfolded into rows.
/// </summary>
internal sealed class StripColumns
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly BlockReader reader;
    private readonly int[] rowOf;
    private readonly byte[] offeredWithWeight;
    private StripRows? unfolded;
    private bool hasIdleLanes;
    private int firstLane;
    private int lanes;

    /// <summary>Columns of strips of the plan's design.</summary>
    public StripColumns(StripPlan plan)
    {
        this.plan = plan;
        reader = plan.Design.Store.Reader();
        var rows = 0;
        rowOf = [.. plan.Design.Store.Format.Columns.Select(c => c.Coding == ColumnCoding.AsIs ? -1 : rows++)];
        offeredWithWeight = new byte[plan.StripLanes / Tile * plan.J];
    }

    /// <summary>Moves to a strip.</summary>
    /// <param name="block">The block.</param>
    /// <param name="firstLaneOfStrip">First lane.</param>
    /// <param name="weight">The lanes' weights. Where one is 0 nothing counts as offered, so that not even a utility that overflows does harm.</param>
    public void Open(DesignBlock block, int firstLaneOfStrip, ReadOnlySpan<double> weight)
    {
        reader.Open(block);
        firstLane = firstLaneOfStrip;
        lanes = weight.Length;
        hasIdleLanes = weight[..Math.Min(lanes, block.Situations - firstLane)].Contains(0.0);
        if (!hasIdleLanes) return;
        var offered = reader.OfferedMasks.Slice(firstLane / Tile * plan.J, lanes / Tile * plan.J);
        for (var lane = 0; lane < lanes; lane += Tile)
        {
            var live = ~Vector512.Equals(Vector512.Create(weight[lane..]), Vector512<double>.Zero).ExtractMostSignificantBits();
            for (var i = lane / Tile * plan.J; i < ((lane / Tile) + 1) * plan.J; i++) offeredWithWeight[i] = (byte)(offered[i] & live);
        }
    }

    /// <summary>Availability mask of an alternative in the first tile; those of the next tiles follow at a distance of J.</summary>
    public ref byte Offered(int alternative) =>
        ref hasIdleLanes ? ref offeredWithWeight[alternative] : ref Mask(reader.OfferedMasks, alternative);

    /// <summary>Choice mask of an alternative in the first tile; those of the next tiles follow at a distance of J.</summary>
    public ref byte Chosen(int alternative) => ref Mask(reader.ChosenMasks, alternative);

    /// <summary>First byte of the strip's lanes of a group's column; of its first column where the group has no such number.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public ref byte Held<THeld, TCount>(ColumnGroup group, int number)
        where THeld : struct, IHeldAs
        where TCount : struct, IColumnCount =>
        ref Unsafe.Add(ref reader.Column(group.Places[number < TCount.Value ? number : 0]), firstLane * THeld.Width);

    /// <summary>Unfolds all columns that are held as whole numbers.</summary>
    public void Unfold()
    {
        var columns = plan.Design.Store.Format.Columns;
        for (var c = 0; c < rowOf.Length; c++)
        {
            if (rowOf[c] < 0) continue;
            unfolded ??= new StripRows(rowOf.Max() + 1, plan.StripLanes);
            ColumnUnfolding.Unfold(reader, c, columns[c], firstLane, unfolded.Lanes(rowOf[c], lanes));
        }
    }

    /// <summary>
    /// The strip's lanes of a stored column as doubles, where the strip is unfolded. Columns do not move: their distances from each other stay
    /// the same while the strip is open.
    /// </summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public ref double Column(int stored) => ref rowOf[stored] >= 0
        ? ref unfolded!.Row(rowOf[stored])
        : ref Unsafe.Add(ref Unsafe.As<byte, double>(ref reader.Column(stored)), firstLane);

    private ref byte Mask(ReadOnlySpan<byte> masks, int alternative) =>
        ref Unsafe.Add(ref MemoryMarshal.GetReference(masks), (firstLane / Tile * plan.J) + alternative);
}
