using System.Runtime.CompilerServices;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// The columns of a strip as doubles. An alternative whose columns are all held as doubles is read where it stands; where one of them is held
/// as whole numbers, all its columns are unfolded into rows of the strip, in the units in which they are held (<see cref="StripPlan.Units"/>).
/// </summary>
internal sealed class StripColumns
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly BlockReader reader;
    private readonly StripRows unfolded;
    private int firstLane;
    private int lanes;

    /// <summary>Columns of strips of the plan's design.</summary>
    public StripColumns(StripPlan plan)
    {
        this.plan = plan;
        reader = plan.Design.Store.Reader();
        unfolded = new StripRows(plan.UnfoldedRows, plan.StripLanes);
    }

    /// <summary>Availability masks of the strip, tile by tile.</summary>
    public ReadOnlySpan<byte> OfferedMasks => reader.OfferedMasks.Slice(firstLane / Tile * plan.J, lanes / Tile * plan.J);

    /// <summary>Choice masks of the strip, tile by tile.</summary>
    public ReadOnlySpan<byte> ChosenMasks => reader.ChosenMasks.Slice(firstLane / Tile * plan.J, lanes / Tile * plan.J);

    /// <summary>Moves to a strip.</summary>
    public void Open(DesignBlock block, int firstLaneOfStrip, int lanesOfStrip)
    {
        reader.Open(block);
        firstLane = firstLaneOfStrip;
        lanes = lanesOfStrip;
    }

    /// <summary>Makes an alternative's columns ready to be read.</summary>
    public void Prepare(LeafColumns leaf)
    {
        if (leaf.FirstUnfolded < 0) return;
        var columns = plan.Design.Store.Format.Columns;
        for (var i = 0; i < leaf.Stored.Length; i++)
        {
            var column = leaf.FirstStored + i;
            ColumnUnfolding.Unfold(reader, column, columns[column], firstLane, unfolded.Lanes(leaf.FirstUnfolded + i, lanes));
        }
    }

    /// <summary>The strip's lanes of an alternative's first column.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public ref double First(LeafColumns leaf) => ref leaf.FirstUnfolded < 0 ? ref InPlace(leaf.FirstStored) : ref unfolded.Row(leaf.FirstUnfolded);

    /// <summary>Distance from one column of an alternative to the next.</summary>
    public nuint StrideOf(LeafColumns leaf) => (nuint)(leaf.FirstUnfolded < 0 ? reader.Block!.Lanes : unfolded.Stride);

    private ref double InPlace(int column) => ref Unsafe.Add(ref Unsafe.As<byte, double>(ref reader.Column(column)), firstLane);
}
