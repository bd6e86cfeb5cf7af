using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Study;
using PanelChoice.Tests.Support;

namespace PanelChoice.Tests.Inference;

/// <summary>Changes synthetic panels: other persons, a dummy, weights, clusters.</summary>
internal static class PanelSurgery
{
    /// <summary>The panel of the listed persons, in that order; a person listed twice is two persons with the same record.</summary>
    public static SyntheticPanel Pick(this SyntheticPanel made, params int[] persons)
    {
        var old = made.Panel;
        var j = old.Alternatives.Length;
        int[] occasions = [.. persons.SelectMany(p => Enumerable.Range(old.PersonStart[p], old.PersonStart[p + 1] - old.PersonStart[p]))];
        var start = new List<int> { 0 };
        foreach (var p in persons) start.Add(start[^1] + old.PersonStart[p + 1] - old.PersonStart[p]);
        ImmutableArray<string> ids = [.. Enumerable.Range(1, persons.Length).Select(i => $"{i}")];
        var panel = old with
        {
            Persons = ids,
            PersonStart = [.. start],
            PersonOf = [.. persons.SelectMany((p, i) => Enumerable.Repeat(i, old.PersonStart[p + 1] - old.PersonStart[p]))],
            Occasion = [.. occasions.Select(o => old.Occasion[o])],
            Row = [.. occasions.SelectMany(o => Enumerable.Range(o * j, j)).Select(c => old.Row[c])],
            Offered = [.. occasions.SelectMany(o => Enumerable.Range(o * j, j)).Select(c => old.Offered[c])],
            Chosen = [.. occasions.Select(o => old.Chosen[o])],
            Weight = [.. persons.Select(p => old.Weight[p])],
            Clusters = ids,
            ClusterOf = [.. Enumerable.Range(0, persons.Length)],
        };
        return made with
        {
            Panel = panel,
            Covariates = made.Covariates with
            {
                Panel = panel,
                Used = [.. Enumerable.Range(0, occasions.Length)],
                Covariates = [.. made.Covariates.Covariates.Select(c => c.IsConstant
                    ? c
                    : c with { Values = [.. occasions.SelectMany(o => c.Values.Skip(o * c.Enters.Length).Take(c.Enters.Length))] })],
            },
        };
    }

    /// <summary>Adds a 0/1 attribute of persons with a coefficient for one alternative.</summary>
    public static SyntheticPanel WithTicket(this SyntheticPanel made, int alternative, params int[] holders)
    {
        var panel = made.Panel;
        var j = panel.Alternatives.Length;
        var values = Enumerable.Range(0, panel.Occasions)
            .Select(o => holders.Contains(panel.PersonOf[o]) && panel.Offered[(o * j) + alternative] ? 1.0 : 0.0);
        var ticket = new Covariate("ticket", panel.Alternatives[alternative], [alternative], [.. values], false, CovariateRole.Present, null, null, 99);
        return made with { Covariates = made.Covariates with { Covariates = made.Covariates.Covariates.Add(ticket) } };
    }

    public static SyntheticPanel Weighted(this SyntheticPanel made, Func<int, double> weight)
    {
        var panel = made.Panel with { Weight = [.. Enumerable.Range(0, made.Panel.Persons.Length).Select(weight)] };
        return made with { Panel = panel, Covariates = made.Covariates with { Panel = panel } };
    }

    public static SyntheticPanel Clustered(this SyntheticPanel made, string by, Func<int, int> clusterOf)
    {
        var of = Enumerable.Range(0, made.Panel.Persons.Length).Select(clusterOf).ToImmutableArray();
        var panel = made.Panel with { ClusterBy = by, ClusterOf = of, Clusters = [.. Enumerable.Range(1, of.Max() + 1).Select(g => $"{g}")] };
        return made with { Panel = panel, Covariates = made.Covariates with { Panel = panel } };
    }

    /// <summary>A start that knows nothing: all coefficients 0, all dissimilarities 0.8, fixed ones where they are.</summary>
    public static double[] PlainStart(this ChoiceDesign design) =>
        [.. design.Layout.Parameters.Select(p => p.Fixed ?? (p.Kind == ParameterKind.Coefficient ? 0 : 0.8))];

    /// <summary>Four alternatives, two of them in a nest, two attributes, habit, tastes that last. One occasion leaves no last choice.</summary>
    public static SyntheticPanel Small(int seed, int persons, int occasions) =>
        SyntheticPanel.Make(
            seed, persons, occasions, 4, [SyntheticPanel.Nest("road", "A", "B")], [0.6], habit: occasions > 1 ? 0.6 : null, tasteSd: 0.8);

    /// <summary>Settings with everything off that a test does not ask for.</summary>
    public static InferenceSettings Settings(JackknifeKind jackknife = JackknifeKind.Off, int replicates = 0, double confidence = 0.95, long seed = 7) =>
        new("person", confidence, jackknife, replicates, seed);
}
