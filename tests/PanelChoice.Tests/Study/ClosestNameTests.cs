using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Study;

public class ClosestNameTests
{
    [Theory]
    [InlineData("fery", "ferry")]
    [InlineData("ferri", "ferry")]
    [InlineData("freyr", null)]
    [InlineData("frery", "ferry")]
    [InlineData("FERRY", "ferry")]
    [InlineData("hydro", "hydrofoil")]
    [InlineData("hydrofiol", "hydrofoil")]
    [InlineData("zeppelin", null)]
    [InlineData("b", null)]
    public void The_closest_name_is_found_and_a_far_one_is_not(string name, string? expected) =>
        Assert.Equal(expected, ClosestName.Of(name, ["tram", "ferry", "hydrofoil", "A"]));

    [Theory]
    [InlineData("", "", 0)]
    [InlineData("abc", "", 3)]
    [InlineData("abc", "abc", 0)]
    [InlineData("abc", "acb", 1)]
    [InlineData("abc", "xbc", 1)]
    [InlineData("kitten", "sitting", 3)]
    public void Edits_are_counted_with_swaps_of_neighbours_as_one(string a, string b, int edits)
    {
        Assert.Equal(edits, ClosestName.Distance(a, b));
        Assert.Equal(edits, ClosestName.Distance(b, a));
    }

    [Fact]
    public void Without_a_close_name_the_remedy_lists_them_all()
    {
        Assert.Equal("use one of: tram, ferry", ClosestName.Remedy("zeppelin", ["tram", "ferry"]));
        Assert.Equal("there is no name to choose from", ClosestName.Remedy("zeppelin", []));
        var many = ClosestName.Remedy("zeppelin", [.. Enumerable.Range(1, 1040).Select(i => $"{i}")]);
        Assert.StartsWith("use one of: 1, 2, ", many, StringComparison.Ordinal);
        Assert.EndsWith(", 29, 30 or the 1,010 others", many, StringComparison.Ordinal);
    }

    [Fact]
    public void A_name_as_long_as_a_book_is_compared_with_nothing()
    {
        var before = GC.GetAllocatedBytesForCurrentThread();
        Assert.Null(ClosestName.Of(new string('x', 1_000_000), ["tram", new string('y', 500)]));
        Assert.True(GC.GetAllocatedBytesForCurrentThread() - before < 10_000_000);
    }
}
