using System.Runtime.CompilerServices;
using PanelChoice.Design;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Design;

public class BlockStoreTests
{
    [Theory]
    [InlineData("0 1 -3 32767", ColumnCoding.Whole16, 0)]
    [InlineData("0 32768", ColumnCoding.Whole32, 0)]
    [InlineData("0 0.1 12.3", ColumnCoding.Whole16, 1)]
    [InlineData("0.07 0.57 327.67", ColumnCoding.Whole16, 2)]
    [InlineData("0.25 1000.125", ColumnCoding.Whole32, 3)]
    [InlineData("0.1 0.30000000000000004", ColumnCoding.AsIs, 0)]
    [InlineData("2147483647", ColumnCoding.Whole32, 0)]
    [InlineData("2147483648", ColumnCoding.AsIs, 0)]
    [InlineData("0.000000001 2.147483647", ColumnCoding.Whole32, 9)]
    [InlineData("0.0000000001", ColumnCoding.AsIs, 0)]
    public void A_column_is_held_as_whole_numbers_just_where_every_value_comes_back(string values, ColumnCoding coding, int decimals)
    {
        double[] column = [.. values.Split(' ').Select(v => double.Parse(v, System.Globalization.CultureInfo.InvariantCulture))];
        var design = OneColumn(column);
        Assert.Equal(new StoredColumn(coding, decimals), design.Store.Format.Columns[0]);
        for (var s = 0; s < column.Length; s++) Assert.Equal(column[s], design.Value(s, design.Columns[0]));
    }

    [Fact]
    public void Columns_of_one_coefficient_share_their_decimals_or_have_none()
    {
        var made = RandomTreeCase.Make(1);
        var (whole, fine, free) = (Filled(made, _ => 3), Filled(made, j => j == 0 ? 0.5 : 2), Filled(made, j => j == 0 ? Math.PI : 2));
        var design = (made with { Terms = [whole, fine, free], Coefficients = [1, 1, 1] }).Design(NestedLogitForm.Unscaled);
        foreach (var column in design.Columns)
        {
            var stored = design.Store.Format.Columns[column.Storage];
            var isOdd = column is { Parameter: 2, Alternative: 0 };
            Assert.Equal(isOdd ? ColumnCoding.AsIs : ColumnCoding.Whole16, stored.Coding);
            Assert.Equal(column.Parameter == 1 ? 1 : 0, stored.Decimals);
        }
    }

    [Fact]
    public void Every_cell_of_a_design_comes_back_equal_and_masks_agree_with_the_panel()
    {
        for (var seed = 1; seed <= 20; seed++)
        {
            var made = RandomTreeCase.Make(seed, 12, 40);
            var design = made.Design(NestedLogitForm.UtilityScaled);
            for (var s = 0; s < design.Situations; s++)
            {
                for (var j = 0; j < design.Alternatives; j++) Assert.Equal(made.Offered[s][j], design.IsOffered(s, j));
                foreach (var column in design.Columns)
                    if (column.Storage >= 0) Assert.Equal(made.Terms[column.Parameter].Value[s][column.Alternative], design.Value(s, column));
            }
        }
    }

    [Fact]
    public void Columns_begin_a_whole_number_of_cache_lines_apart_and_padding_offers_nothing()
    {
        var design = RandomTreeCase.Make(2, 60, 30).Design(NestedLogitForm.UtilityScaled);
        var reader = design.Store.Reader();
        var bytes = 0L;
        foreach (var block in design.Blocks)
        {
            reader.Open(block);
            for (var c = 0; c < design.Store.Format.Columns.Length; c++)
                Assert.Equal(0, Unsafe.ByteOffset(ref reader.Column(0), ref reader.Column(c)) % BlockFormat.Line);
            for (var lane = block.Situations; lane < block.Lanes; lane++)
                for (var j = 0; j < design.Alternatives; j++) Assert.False(reader.IsOffered(lane, j));
            bytes += design.Store.Format.Bytes(block.Lanes);
        }

        Assert.True(design.Blocks.Length > 2);
        Assert.Equal(bytes, design.Store.Bytes);
    }

    [Fact]
    public void A_value_that_its_coding_cannot_hold_is_refused()
    {
        var format = new BlockFormat([new StoredColumn(ColumnCoding.Whole16, 1)], 2);
        var block = new byte[format.Bytes(8)];
        format.Encode(0, [0, 0.1, 0.2, -0.3, 5, 6, 7, 3276.7], block);
        var thrown = Assert.Throws<ArgumentException>(() => format.Encode(0, [0, 0.1, 0.25, 0, 0, 0, 0, 0], block));
        Assert.Contains("0.25", thrown.Message, StringComparison.Ordinal);
        Assert.Throws<ArgumentException>(() => format.Encode(0, [40000, 0, 0, 0, 0, 0, 0, 0], block));
    }

    private static RandomTerm Filled(RandomTreeCase made, Func<int, double> value) => new(
        [.. Enumerable.Range(0, made.Names.Length)], false,
        [.. made.Offered.Select(row => row.Select((o, j) => o ? value(j) : 0).ToArray())]);

    /// <summary>Two alternatives, always on offer, one person; the column is in the utility of the first.</summary>
    private static ChoiceDesign OneColumn(double[] column)
    {
        var made = new RandomTreeCase(
            ["A", "B"], [], [new RandomTerm([0], false, [.. column.Select(x => new[] { x, 0 })])], [column.Length],
            [.. column.Select(_ => new[] { true, true })], new int[column.Length], [1], System.Collections.Immutable.ImmutableDictionary<string, double>.Empty, [1]);
        return made.Design(NestedLogitForm.UtilityScaled);
    }
}
