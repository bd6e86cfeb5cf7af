using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Study;

public class ProblemListTests
{
    private static Problem At(string id, long row, string? column = null) => new(id, "a.csv", "is wrong", "mend it") { Row = row, Column = column };

    [Fact]
    public void Twenty_of_a_kind_are_listed_without_a_total()
    {
        var list = new ProblemList();
        for (var row = 1; row <= 20; row++) list.Add(At("data.x", row));
        Assert.Equal(20, ProblemList.InRowOrder(list).Length);
    }

    [Fact]
    public void A_longer_list_is_cut_and_says_how_many_there_are()
    {
        var list = new ProblemList();
        for (var row = 1; row <= 1234; row++) list.Add(At("data.x", row));
        var problems = ProblemList.InRowOrder(list);
        Assert.Equal(21, problems.Length);
        Assert.Equal(Enumerable.Range(1, 20).Select(r => (long?)r), problems.Take(20).Select(p => p.Row));
        Assert.Equal("data.x", problems[20].Id);
        Assert.Equal(1234, problems[20].Total);
        Assert.Null(problems[20].Row);
        Assert.Contains("1,234 problems of this kind in all, of which the first 20 are listed", problems[20].Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Each_kind_has_its_own_twenty_and_kinds_keep_the_order_of_the_file()
    {
        var list = new ProblemList();
        for (var row = 1; row <= 30; row++)
        {
            list.Add(At("data.first", row));
            list.Add(At("data.second", row));
        }

        var problems = ProblemList.InRowOrder(list);
        Assert.Equal(42, problems.Length);
        Assert.All(problems.Take(21), p => Assert.Equal("data.first", p.Id));
        Assert.All(problems.Skip(21), p => Assert.Equal("data.second", p.Id));
    }

    [Fact]
    public void Lists_of_several_columns_join_in_the_order_of_rows()
    {
        var left = new ProblemList();
        var right = new ProblemList();
        for (var row = 1; row <= 40; row++)
        {
            left.Add(At("data.x", 2 * row, "left"));
            right.Add(At("data.x", row, "right"));
        }

        var problems = ProblemList.InRowOrder(left, right);
        Assert.Equal([1, 2, 2, 3, 4, 4, 5, 6, 6, 7, 8, 8, 9, 10, 10, 11, 12, 12, 13, 14], problems.Take(20).Select(p => p.Row ?? 0));
        Assert.Equal(["right", "left", "right"], problems.Take(3).Select(p => p.Column));
        Assert.Equal(80, problems[20].Total);
    }
}
