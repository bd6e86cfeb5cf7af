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
/// <param name="PersonStart">First situation of each of the sample's persons; one more entry closes the last.</param>
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
    ImmutableArray<int> PersonStart,
    ImmutableArray<double> PersonWeight,
    string ClusterBy,
    ImmutableArray<int> ClusterOf,
    ImmutableArray<string> Clusters)
{
    /// <summary>Lanes of one tile.</summary>
    public const int TileLanes = 8;

    /// <summary>Number of situations.</summary>
    public int Situations => PersonStart[^1];

    /// <summary>Number of persons in the sample.</summary>
    public int Persons => PersonWeight.Length;

    /// <summary>Number of alternatives.</summary>
    public int Alternatives => Tree.Alternatives.Length;

    /// <summary>Person (index into the sample's persons) of each situation: looked up, because a large panel has no memory to spare for each situation.</summary>
    public SituationIndex PersonOf => new(PersonStart);

    /// <summary>Block of each situation.</summary>
    public SituationIndex BlockOf { get; } = new([.. Blocks.Select(b => b.FirstSituation)]);
}

/// <summary>Finds the run of situations, a person's or a block's, that a situation belongs to.</summary>
/// <param name="start">First situation of each run, ascending.</param>
public readonly struct SituationIndex(ImmutableArray<int> start)
{
    private readonly ImmutableArray<int> start = start;

    /// <summary>The run of a situation.</summary>
    /// <param name="situation">The situation.</param>
    public int this[int situation] => start.BinarySearch(situation) is var at && at >= 0 ? at : ~at - 1;
}
