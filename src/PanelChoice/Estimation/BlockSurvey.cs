using System.Numerics;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Estimation;

/// <summary>
/// The survey of one block, tile by tile of eight situations: each column inside choice sets, and how wide the nests are. Alternatives that a
/// column does not enter have the value 0. Everything is seen in the units in which columns are held. One instance is a work space of one thread.
/// </summary>
internal sealed class BlockSurvey
{
    /// <summary>Differences below this share of the largest value in the choice set are rounding.</summary>
    private const double Rounding = 1e-10;

    private const int Tile = ChoiceDesign.TileLanes;
    private readonly ChoiceDesign design;
    private readonly BlockReader reader;
    private readonly (int Parameter, int[] Alternatives, int[] Columns)[] coefficients;
    private readonly byte[] isOffered;
    private double[] values = [];
    private double[] count = [];
    private byte[] varies = [];
    private byte[] more = [];
    private byte[] less = [];

    /// <summary>A work space for a design.</summary>
    public BlockSurvey(ChoiceDesign design)
    {
        this.design = design;
        reader = design.Store.Reader();
        coefficients =
        [
            .. design.Columns.GroupBy(c => c.Parameter).OrderBy(g => g.Key)
                .Select(g => (g.Key, g.Select(c => c.Alternative).ToArray(), g.Select(c => c.Storage).ToArray())),
        ];
        isOffered = new byte[design.Alternatives + design.Tree.Nodes.Length];
    }

    /// <summary>Surveys a block.</summary>
    /// <param name="block">The block.</param>
    /// <param name="squares">To it is added, for each coefficient, the sum of squared deviations from the mean of the choice set.</param>
    /// <param name="byPerson">Receives the evidence: persons x K.</param>
    /// <param name="isEverChosen">Is told the alternatives that are chosen.</param>
    /// <returns>The number of offered alternatives.</returns>
    public long Add(DesignBlock block, double[] squares, Evidence[] byPerson, bool[] isEverChosen)
    {
        reader.Open(block);
        for (var i = 0; i < reader.ChosenMasks.Length; i++) if (reader.ChosenMasks[i] != 0) isEverChosen[i % design.Alternatives] = true;
        var tiles = block.Lanes / Tile;
        if (varies.Length < tiles) (varies, more, less, count) = (new byte[tiles], new byte[tiles], new byte[tiles], new double[block.Lanes]);
        CountOffered(tiles);
        foreach (var (k, alternatives, columns) in coefficients)
        {
            if (values.Length < block.Lanes * columns.Length) values = new double[block.Lanes * columns.Length];
            for (var i = 0; i < columns.Length; i++)
            {
                var lanes = values.AsSpan(i * block.Lanes, block.Lanes);
                if (columns[i] < 0) lanes.Fill(1);
                else ColumnUnfolding.Unfold(reader, columns[i], design.Store.Format.Columns[columns[i]], 0, lanes);
            }

            var units = columns[0] < 0 ? 1 : design.Store.Format.Columns[columns[0]].Units;
            squares[k] += SurveyColumn(block, alternatives) / (units * units);
            Hand(block, k, byPerson);
        }

        return SurveyNests(block, byPerson);
    }

    private void CountOffered(int tiles)
    {
        var J = design.Alternatives;
        for (var tile = 0; tile < tiles; tile++)
        {
            var sum = Vector512<double>.Zero;
            foreach (var mask in reader.OfferedMasks.Slice(tile * J, J)) sum += Select(mask, Vector512<double>.One);
            sum.StoreUnsafe(ref count[tile * Tile]);
        }
    }

    private double SurveyColumn(DesignBlock block, int[] alternatives)
    {
        var J = design.Alternatives;
        var stride = (nuint)block.Lanes;
        var squares = Vector512<double>.Zero;
        ref var value = ref MemoryMarshal.GetArrayDataReference(values);
        for (var tile = 0; tile < block.Lanes / Tile; tile++)
        {
            var lane = (nuint)(tile * Tile);
            var offered = reader.OfferedMasks.Slice(tile * J, J);
            var chosen = reader.ChosenMasks.Slice(tile * J, J);
            var size = Vector512.LoadUnsafe(ref count[0], lane);
            var own = Vector512<double>.Zero;
            var sum = Vector512<double>.Zero;
            var ofChosen = Vector512<double>.Zero;
            var min = Vector512.Create(double.PositiveInfinity);
            var max = Vector512.Create(double.NegativeInfinity);
            for (var i = 0; i < alternatives.Length; i++)
            {
                var x = Vector512.LoadUnsafe(ref value, lane + ((nuint)i * stride));
                var lanes = TileMask.Lanes(offered[alternatives[i]]);
                own += lanes & Vector512<double>.One;
                sum += lanes & x;
                ofChosen += Select(chosen[alternatives[i]], x);
                min = Vector512.ConditionalSelect(lanes, Vector512.MinNative(min, x), min);
                max = Vector512.ConditionalSelect(lanes, Vector512.MaxNative(max, x), max);
            }

            var others = size - own;
            var hasOthers = Vector512.GreaterThan(others, Vector512<double>.Zero);
            min = Vector512.ConditionalSelect(hasOthers, Vector512.MinNative(min, Vector512<double>.Zero), min);
            max = Vector512.ConditionalSelect(hasOthers, Vector512.MaxNative(max, Vector512<double>.Zero), max);
            var rounding = Vector512.Create(Rounding) * Vector512.MaxNative(Vector512.Abs(min), Vector512.Abs(max));
            // In a lane where nothing is offered the difference is minus infinity and the comparison false.
            var spread = Vector512.GreaterThan(max - min, rounding);
            var mean = sum / Vector512.MaxNative(size, Vector512<double>.One);
            var deviations = others * mean * mean;
            for (var i = 0; i < alternatives.Length; i++)
            {
                var x = Vector512.LoadUnsafe(ref value, lane + ((nuint)i * stride)) - mean;
                deviations += TileMask.Lanes(offered[alternatives[i]]) & (x * x);
            }

            squares += spread & deviations;
            varies[tile] = (byte)spread.ExtractMostSignificantBits();
            more[tile] = (byte)(spread & Vector512.GreaterThan(ofChosen - min, rounding)).ExtractMostSignificantBits();
            less[tile] = (byte)(spread & Vector512.GreaterThan(max - ofChosen, rounding)).ExtractMostSignificantBits();
        }

        return Vector512.Sum(squares);
    }

    /// <summary>Gives each person of the block the evidence that one of the person's lanes has.</summary>
    private void Hand(DesignBlock block, int k, Evidence[] byPerson)
    {
        var K = design.Layout.Count;
        var end = block.FirstSituation + block.Situations;
        var lane = 0;
        for (var person = design.PersonOf[block.FirstSituation]; lane < block.Situations; person++)
        {
            var next = Math.Min(design.PersonStart[person + 1], end) - block.FirstSituation;
            int anyVaries = 0, anyMore = 0, anyLess = 0;
            for (var tile = lane / Tile; tile <= (next - 1) / Tile; tile++)
            {
                var own = (tile == lane / Tile ? 0xFF << (lane % Tile) : 0xFF) & (tile == (next - 1) / Tile ? 0xFF >> (Tile - 1 - ((next - 1) % Tile)) : 0xFF);
                anyVaries |= varies[tile] & own;
                anyMore |= more[tile] & own;
                anyLess |= less[tile] & own;
            }

            byPerson[(person * K) + k] |= (anyVaries != 0 ? Evidence.Varies : 0) | (anyMore != 0 ? Evidence.ChosenHasMore : 0) | (anyLess != 0 ? Evidence.ChosenHasLess : 0);
            lane = next;
        }
    }

    /// <summary>Marks the nests that are two or more wide and counts the offered alternatives.</summary>
    private long SurveyNests(DesignBlock block, Evidence[] byPerson)
    {
        var J = design.Alternatives;
        var nodes = design.Tree.Nodes;
        var cells = 0L;
        foreach (var mask in reader.OfferedMasks) cells += BitOperations.PopCount(mask);
        for (var n = 0; n < nodes.Length; n++)
        {
            if (design.Layout.NodeParameter[n] is not (>= 0 and var k)) continue;
            for (var tile = 0; tile < block.Lanes / Tile; tile++)
            {
                varies[tile] = WideAt(reader.OfferedMasks.Slice(tile * J, J), n);
                more[tile] = less[tile] = 0;
            }

            Hand(block, k, byPerson);
        }

        return cells;
    }

    /// <summary>The lanes of a tile in which two or more of a node's children have something on offer.</summary>
    private byte WideAt(ReadOnlySpan<byte> offered, int node)
    {
        var nodes = design.Tree.Nodes;
        var J = design.Alternatives;
        offered.CopyTo(isOffered);
        var wide = 0;
        for (var n = 0; n <= node; n++)
        {
            int once = 0, twice = 0;
            foreach (var c in nodes[n].Children)
            {
                twice |= once & isOffered[c];
                once |= isOffered[c];
            }

            isOffered[J + n] = (byte)once;
            wide = twice;
        }

        return (byte)wide;
    }

    private static Vector512<double> Select(byte mask, Vector512<double> value) => TileMask.Lanes(mask) & value;
}
