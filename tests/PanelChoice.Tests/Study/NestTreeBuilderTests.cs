using System.Collections.Immutable;
using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Study;

public class NestTreeBuilderTests
{
    private static readonly ImmutableArray<string> Modes = ["drive", "tram", "ferry", "hydrofoil", "walk"];

    [Fact]
    public void Without_nests_all_alternatives_hang_on_the_root()
    {
        var tree = Built("");
        Assert.Equal(Modes, tree.Alternatives.AsEnumerable());
        var root = Assert.Single(tree.Nodes);
        Assert.Equal(("", 1.0, 0), (root.Name, root.Dissimilarity!.Value, root.Owner));
        Assert.Equal([0, 1, 2, 3, 4], root.Children.AsEnumerable());
    }

    [Fact]
    public void Children_stand_before_parents_whatever_the_order_of_the_file()
    {
        var tree = Built(
            """
            [[nest]]
            name = "public"
            members = ["river", "tram"]
            [[nest]]
            name = "river"
            members = ["hydrofoil", "ferry"]
            """);
        Assert.Equal(["river", "public", ""], tree.Nodes.Select(n => n.Name));
        Assert.Equal([2, 3], tree.Nodes[0].Children.AsEnumerable());
        Assert.Equal([1, 5], tree.Nodes[1].Children.AsEnumerable());
        Assert.Equal([0, 4, 6], tree.Nodes[2].Children.AsEnumerable());
        Assert.Equal([0, 1, 2], tree.Nodes.Select(n => n.Owner));
        Assert.Equal([null, null, 1.0], tree.Nodes.Select(n => n.Dissimilarity));
        Assert.Equal([1, 2, 3], tree.AlternativesUnder(1).AsEnumerable());
    }

    [Fact]
    public void A_shared_parameter_belongs_to_the_end_of_the_chain_and_takes_its_fixed_value()
    {
        var tree = Built(
            """
            [[nest]]
            name = "river"
            members = ["hydrofoil", "ferry"]
            same_as = "road"
            [[nest]]
            name = "road"
            members = ["drive"]
            same_as = "rail"
            [[nest]]
            name = "rail"
            members = ["tram"]
            dissimilarity = 0.4
            """);
        Assert.Equal([2, 2, 2, 3], tree.Nodes.Select(n => n.Owner));
        Assert.Equal([0.4, 0.4, 0.4, 1.0], tree.Nodes.Select(n => n.Dissimilarity));
    }

    [Fact]
    public void An_unknown_member_is_a_problem_with_a_suggestion()
    {
        var problem = Assert.Single(Problems("[[nest]]\nname = \"river\"\nmembers = [\"fery\", \"hydrofoil\"]\n"));
        Assert.Equal(("study.unknown_member", "fery", 10), (problem.Id, problem.Value, problem.Line!.Value));
        Assert.Contains("did you mean 'ferry'?", problem.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_nest_called_like_an_alternative_is_a_problem()
    {
        var problem = Assert.Single(Problems("[[nest]]\nname = \"walk\"\nmembers = [\"ferry\", \"hydrofoil\"]\n"));
        Assert.Equal(("study.name_clash", "walk", 10), (problem.Id, problem.Value, problem.Line!.Value));
    }

    private static NestTree Built(string nests)
    {
        var built = NestTreeBuilder.Build(StudyText.Good(StudyText.Small + nests), Modes);
        Assert.Empty(built.Problems);
        return built.Value!;
    }

    private static ImmutableArray<Problem> Problems(string nests) =>
        NestTreeBuilder.Build(StudyText.Good(StudyText.Small + nests), Modes).Problems;
}
