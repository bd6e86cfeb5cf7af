namespace PanelChoice.Design;

/// <summary>Designs that see another one's blocks with other eyes.</summary>
internal static class DesignViews
{
    /// <summary>The design with every person counted once.</summary>
    public static ChoiceDesign Unweighted(this ChoiceDesign design) => design with { PersonWeight = [.. Enumerable.Repeat(1.0, design.Persons)] };

    /// <summary>The design without some coefficients, whose columns stay in the blocks and are passed over.</summary>
    /// <param name="design">The design.</param>
    /// <param name="coefficients">The coefficients to leave out.</param>
    public static ChoiceDesign Without(this ChoiceDesign design, IReadOnlySet<int> coefficients)
    {
        var layout = design.Layout;
        var kept = Enumerable.Range(0, layout.Count).Where(k => !coefficients.Contains(k)).ToList();
        var number = Enumerable.Repeat(-1, layout.Count).ToArray();
        for (var k = 0; k < kept.Count; k++) number[kept[k]] = k;
        return design with
        {
            Columns = [.. design.Columns.Where(c => number[c.Parameter] >= 0).Select(c => c with { Parameter = number[c.Parameter] })],
            Layout = new ParameterLayout(
                [.. kept.Select(k => layout.Parameters[k])], kept.Count(k => k < layout.Coefficients),
                [.. layout.NodeParameter.Select(k => k < 0 ? k : number[k])], [.. layout.Nests.Select(n => n with { Parameter = number[n.Parameter] })]),
        };
    }
}
