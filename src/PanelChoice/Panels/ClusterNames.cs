using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>The clusters of a whole panel in their order.</summary>
/// <param name="Names">Their names.</param>
/// <param name="Rank">Place of each code of the cluster column among them.</param>
internal sealed record ClusterNames(ImmutableArray<string> Names, int[] Rank)
{
    /// <summary>The clusters of a table; null where persons are the clusters.</summary>
    public static ClusterNames? Of(StudySpecification study, ChoiceTable table) =>
        study.Inference.Cluster == "person" ? null : Of(table.Texts[study.Inference.Cluster].Levels);

    /// <summary>The clusters of a file; null where persons are the clusters.</summary>
    public static ClusterNames? Of(StudySpecification study, TableOutline outline) =>
        study.Inference.Cluster == "person" ? null : Of(outline.Texts[study.Inference.Cluster]);

    private static ClusterNames Of(ImmutableArray<string> values)
    {
        var order = NameOrder.Of(values);
        return new ClusterNames([.. order.Select(c => values[c])], NameOrder.Ranks(order));
    }
}
