using System.Collections.Immutable;
using PanelChoice.Data;

namespace PanelChoice.Panels;

/// <summary>
/// The recorded panel: persons in order of their ids (numerically when all are whole numbers, ordinally otherwise), each person's
/// occasions in order, each occasion's choice set. Alternatives are in ordinal order, so that the order of rows in the file means nothing.
/// J is the number of alternatives; a cell is <c>occasion * J + alternative</c>.
/// </summary>
/// <param name="Table">The table the panel was made from.</param>
/// <param name="Persons">Person ids.</param>
/// <param name="Alternatives">Alternative names.</param>
/// <param name="PersonStart">First occasion of each person; one more entry closes the last person.</param>
/// <param name="PersonOf">Person of each occasion.</param>
/// <param name="Occasion">Whole number or day number of each occasion.</param>
/// <param name="Row">Table row of each cell, or -1 where the alternative has no row.</param>
/// <param name="Offered">Whether the alternative of the cell was available.</param>
/// <param name="Chosen">Alternative chosen at each occasion.</param>
/// <param name="Weight">Sampling weight of each person; 1 throughout without weights (then <see cref="IsWeighted"/> is false).</param>
/// <param name="ClusterBy">"person", or the cluster column's name.</param>
/// <param name="Clusters">Names of the clusters.</param>
/// <param name="ClusterOf">Cluster of each person.</param>
public sealed record ChoicePanel(
    ChoiceTable Table,
    ImmutableArray<string> Persons,
    ImmutableArray<string> Alternatives,
    ImmutableArray<int> PersonStart,
    ImmutableArray<int> PersonOf,
    ImmutableArray<long> Occasion,
    ImmutableArray<int> Row,
    ImmutableArray<bool> Offered,
    ImmutableArray<int> Chosen,
    ImmutableArray<double> Weight,
    string ClusterBy,
    ImmutableArray<string> Clusters,
    ImmutableArray<int> ClusterOf)
{
    /// <summary>Code of each occasion in the column of the second grouping; empty where the study names no such column.</summary>
    internal ImmutableArray<int> SecondCluster { get; init; } = [];

    /// <summary>Number of recorded occasions over all persons.</summary>
    public int Occasions => Occasion.Length;

    /// <summary>Whether the study names a weight column.</summary>
    public bool IsWeighted => !Table.Weight.IsEmpty;

    /// <summary>Number of alternatives offered at an occasion.</summary>
    public int OfferedAt(int occasion)
    {
        var count = 0;
        for (var j = 0; j < Alternatives.Length; j++) if (Offered[(occasion * Alternatives.Length) + j]) count++;
        return count;
    }
}
