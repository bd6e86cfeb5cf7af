using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>
/// What a nest's dissimilarity is compared with. Consistent with utility maximisation is 0 &lt; l_child &lt;= l_parent &lt;= 1 in the
/// utility-scaled form (McFadden 1981), where a nest that is never wider than one alternative has no say, and 0 &lt; l &lt;= 1 in the unscaled one,
/// whose l is already a ratio.
/// </summary>
internal static class NestOrder
{
    /// <summary>Parameter that bounds a nest's from above; -1 for 1.</summary>
    public static int Above(ChoiceDesign design, NestedLogitForm form, int node)
    {
        if (form == NestedLogitForm.Unscaled) return -1;
        var above = design.Tree.ParentOf(design.Alternatives + node);
        while (above != design.Tree.Root && design.Layout.Nests.First(p => p.Node == above).WideSituations == 0)
            above = design.Tree.ParentOf(design.Alternatives + above);
        return design.Layout.NodeParameter[above];
    }

    /// <summary>Whether a nest's own parameter has a say in the likelihood.</summary>
    public static bool Matters(NestPlace place, NestedLogitForm form) => form == NestedLogitForm.Unscaled || place.WideSituations > 0;
}
