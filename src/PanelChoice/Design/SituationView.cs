using System.Runtime.InteropServices;

namespace PanelChoice.Design;

/// <summary>A design in which every situation counts by itself, so that situations can be weighted; blocks and columns are the same.</summary>
internal static class SituationView
{
    /// <summary>The view.</summary>
    /// <param name="design">The design.</param>
    /// <param name="groupBy">What a group of situations with a common weight is.</param>
    /// <param name="groupOf">Group of each situation, 0 to <paramref name="groups"/> - 1 without holes; null: each is its own.</param>
    /// <param name="groups">Number of groups.</param>
    public static ChoiceDesign BySituation(this ChoiceDesign design, string groupBy, int[]? groupOf, int groups)
    {
        var weight = new double[design.Situations];
        for (var p = 0; p < design.Persons; p++)
            weight.AsSpan(design.PersonStart[p], design.PersonStart[p + 1] - design.PersonStart[p]).Fill(design.PersonWeight[p]);
        return design with
        {
            PersonStart = [.. Enumerable.Range(0, design.Situations + 1)],
            PersonWeight = ImmutableCollectionsMarshal.AsImmutableArray(weight),
            ClusterBy = groupBy,
            ClusterOf = [.. groupOf ?? Enumerable.Range(0, design.Situations)],
            // Nobody asks for the name of a group: refits know them by number alone.
            Clusters = [.. Enumerable.Repeat("", groups)],
        };
    }
}
