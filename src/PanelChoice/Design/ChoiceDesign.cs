using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Design;

/// <summary>One product coefficient x covariate in the utility of one alternative.</summary>
/// <param name="Parameter">Index of the coefficient.</param>
/// <param name="Alternative">Alternative whose utility it enters.</param>
/// <param name="Storage">Stored column inside a block; -1 for the constant 1, which is not stored.</param>
public sealed record DesignColumn(int Parameter, int Alternative, int Storage);

/// <summary>A run of situations that holds whole persons; its lanes are padded to a multiple of 8.</summary>
/// <param name="Index">Its place among the blocks.</param>
/// <param name="FirstSituation">First situation.</param>
/// <param name="Situations">Number of situations.</param>
/// <param name="Lanes">Situations rounded up to a multiple of <see cref="ChoiceDesign.TileLanes"/>.</param>
public sealed record DesignBlock(int Index, int FirstSituation, int Situations, int Lanes);

/// <summary>
/// The estimation sample laid out for the kernels. A situation is a used occasion; situations of one person are consecutive. In a block
/// the stored columns follow each other, each <c>Lanes</c> values long, ordered by alternative and then by parameter, so that a pass reads
/// memory in one forward stream; masks say what is offered and what is chosen (<see cref="BlockFormat"/>).
/// Padding lanes have no offered alternative, no choice and value 0.
/// </summary>
/// <param name="Tree">The nest tree.</param>
/// <param name="Layout">The parameters.</param>
/// <param name="Columns">Products coefficient x covariate, ordered by alternative, then parameter.</param>
/// <param name="Blocks">The blocks in order.</param>
/// <param name="Store">Their columns and masks.</param>
/// <param name="Chosen">Chosen alternative of each situation.</param>
/// <param name="PanelOccasion">Panel occasion of each situation.</param>
/// <param name="PersonStart">First situation of each of the sample's persons; one more entry closes the last.</param>
/// <param name="PanelPerson">Panel person of each of the sample's persons.</param>
/// <param name="PersonWeight">Sampling weight of each of the sample's persons (1 without weights).</param>
/// <param name="ClusterBy">"person" or the cluster column.</param>
/// <param name="ClusterOf">Cluster of each of the sample's persons, numbered 0 to G - 1 without holes.</param>
/// <param name="Clusters">Names of the G clusters that have a situation.</param>
public sealed record ChoiceDesign(
    NestTree Tree,
    ParameterLayout Layout,
    ImmutableArray<DesignColumn> Columns,
    ImmutableArray<DesignBlock> Blocks,
    BlockStore Store,
    ImmutableArray<int> Chosen,
    ImmutableArray<int> PanelOccasion,
    ImmutableArray<int> PersonStart,
    ImmutableArray<int> PanelPerson,
    ImmutableArray<double> PersonWeight,
    string ClusterBy,
    ImmutableArray<int> ClusterOf,
    ImmutableArray<string> Clusters)
{
    /// <summary>Lanes of one tile.</summary>
    public const int TileLanes = 8;

    /// <summary>Number of situations.</summary>
    public int Situations => Chosen.Length;

    /// <summary>Number of persons in the sample.</summary>
    public int Persons => PersonWeight.Length;

    /// <summary>Number of alternatives.</summary>
    public int Alternatives => Tree.Alternatives.Length;

    /// <summary>Person (index into the sample's persons) of each situation.</summary>
    public ImmutableArray<int> PersonOf { get; } = Expand(PersonStart);

    /// <summary>Block of each situation, for code that walks situations one by one.</summary>
    public ImmutableArray<int> BlockOf { get; } = [.. Blocks.SelectMany((b, i) => Enumerable.Repeat(i, b.Situations))];

    private static ImmutableArray<int> Expand(ImmutableArray<int> start)
    {
        var persons = new int[start[^1]];
        for (var p = 0; p + 1 < start.Length; p++) Array.Fill(persons, p, start[p], start[p + 1] - start[p]);
        return [.. persons];
    }
}
