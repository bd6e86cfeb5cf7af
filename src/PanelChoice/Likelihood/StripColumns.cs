using System.Runtime.CompilerServices;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// The columns of a strip as doubles, in the units in which they are held (<see cref="StripPlan.Units"/>). A column held as doubles is read
/// where it stands: copying it would cost as much as all that is done with it. One held as whole numbers is unfolded into a row of the strip.
/// </summary>
internal sealed class StripColumns
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly BlockReader reader;
    private readonly StripRows unfolded;
    private readonly int[] rowOf;
    private int firstLane;
    private int lanes;

    /// <summary>Columns of strips of the plan's design.</summary>
    public StripColumns(StripPlan plan)
    {
        this.plan = plan;
        reader = plan.Design.Store.Reader();
        var rows = 0;
        rowOf = [.. plan.Design.Store.Format.Columns.Select(c => c.Coding == ColumnCoding.AsIs ? -1 : rows++)];
        unfolded = new StripRows(rows, plan.StripLanes);
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
        var columns = plan.Design.Store.Format.Columns;
        foreach (var column in leaf.Places)
            if (rowOf[column] >= 0) ColumnUnfolding.Unfold(reader, column, columns[column], firstLane, unfolded.Lanes(rowOf[column], lanes));
    }

    /// <summary>The strip's lanes of a stored column. Columns do not move: their distances from each other stay the same while the strip is open.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public ref double Column(int stored) => ref rowOf[stored] >= 0
        ? ref unfolded.Row(rowOf[stored])
        : ref Unsafe.Add(ref Unsafe.As<byte, double>(ref reader.Column(stored)), firstLane);
}
