using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Study;

namespace PanelChoice.Design;

/// <summary>Everything about a design but the content of its blocks.</summary>
/// <param name="Tree">The nest tree.</param>
/// <param name="Layout">The parameters.</param>
/// <param name="Covariates">Covariates of the coefficients, in order; their values do not count.</param>
/// <param name="Columns">Products coefficient x covariate.</param>
/// <param name="Format">How a block is laid out.</param>
/// <param name="Blocks">The blocks.</param>
/// <param name="PersonStart">First situation of each person; one more entry closes the last.</param>
/// <param name="PersonWeight">Sampling weight of each person.</param>
/// <param name="ClusterBy">"person" or the cluster column.</param>
/// <param name="ClusterOf">Cluster of each person.</param>
/// <param name="Clusters">Names of the clusters.</param>
internal sealed record DesignPlan(
    NestTree Tree, ParameterLayout Layout, ImmutableArray<Covariate> Covariates, ImmutableArray<DesignColumn> Columns, BlockFormat Format,
    ImmutableArray<DesignBlock> Blocks, ImmutableArray<int> PersonStart, ImmutableArray<double> PersonWeight, string ClusterBy, ImmutableArray<int> ClusterOf,
    ImmutableArray<string> Clusters)
{
    private const int TargetLanes = 256;

    /// <summary>Plans a design once all persons were looked at.</summary>
    /// <param name="survey">What was seen of them.</param>
    /// <param name="planned">The covariates that were surveyed, in order.</param>
    /// <param name="keeps">Which of them stay.</param>
    /// <param name="tree">The nest tree.</param>
    /// <param name="nests">The study's nests, which give the order of the dissimilarities.</param>
    /// <param name="form">The form.</param>
    /// <param name="clusterBy">"person" or the cluster column.</param>
    /// <param name="clusters">Names of the clusters of the whole panel.</param>
    public static DesignPlan Of(
        DesignSurvey survey, ImmutableArray<Covariate> planned, Func<Covariate, bool> keeps, NestTree tree, ImmutableArray<NestSpecification> nests,
        NestedLogitForm form, string clusterBy, ImmutableArray<string> clusters)
    {
        int[] kept = [.. Enumerable.Range(0, planned.Length).Where(k => keeps(planned[k]))];
        ImmutableArray<Covariate> covariates = [.. kept.Select(k => planned[k])];
        var columns = ColumnsOf(covariates, tree.Alternatives.Length);
        var codings = kept.Select(survey.CodingsOf).ToArray();
        ImmutableArray<StoredColumn> stored =
            [.. columns.Where(c => c.Storage >= 0).OrderBy(c => c.Storage).Select(c => codings[c.Parameter][covariates[c.Parameter].Enters.IndexOf(c.Alternative)])];
        ImmutableArray<int> personStart = [.. survey.PersonStart];
        var present = survey.Cluster.Distinct().Order().ToList();
        var number = present.Select((c, i) => (c, i)).ToDictionary(x => x.c, x => x.i);
        return new DesignPlan(
            tree, LayOutParameters(covariates, survey.Wide, tree, nests, form), covariates, columns, new BlockFormat(stored, tree.Alternatives.Length),
            BlocksOf(personStart), personStart, [.. survey.Weight], clusterBy, [.. survey.Cluster.Select(c => number[c])], [.. present.Select(c => clusters[c])]);
    }

    /// <summary>Number of persons before the end of each block; 0 before the first.</summary>
    public HashSet<int> BlockEnds()
    {
        var persons = new SituationIndex(PersonStart);
        return [0, .. Blocks.Select(b => persons[b.FirstSituation + b.Situations - 1] + 1)];
    }

    /// <summary>The design whose blocks a store holds.</summary>
    public ChoiceDesign On(BlockStore store) => new(Tree, Layout, Columns, Blocks, store, PersonStart, PersonWeight, ClusterBy, ClusterOf, Clusters);

    private static ParameterLayout LayOutParameters(
        ImmutableArray<Covariate> covariates, int[] wide, NestTree tree, ImmutableArray<NestSpecification> nests, NestedLogitForm form)
    {
        var parameters = new List<ModelParameter>();
        foreach (var c in covariates)
            parameters.Add(new ModelParameter(c.Term, c.Alternative, ParameterKind.Coefficient, c.Fixed, c.Start, c.Role));
        var coefficients = parameters.Count;

        var nodeParameter = Enumerable.Repeat(-1, tree.Nodes.Length).ToArray();
        var nodeOf = tree.Nodes.Select((n, i) => (n.Name, i)).Where(x => x.i != tree.Root).ToDictionary(x => x.Name, x => x.i);
        foreach (var nest in nests)
        {
            var node = nodeOf[nest.Name];
            if (tree.Nodes[node].Owner != node) continue;
            var everWide = Enumerable.Range(0, tree.Nodes.Length).Any(n => tree.Nodes[n].Owner == node && wide[n] > 0);
            var unidentified = form == NestedLogitForm.UtilityScaled && !everWide;
            nodeParameter[node] = parameters.Count;
            // Where the nest is never wide its value drops out of every probability; 1 stands in for it and the report names the parent's.
            parameters.Add(new ModelParameter(
                nest.Name, null, ParameterKind.Dissimilarity, tree.Nodes[node].Dissimilarity ?? (unidentified ? 1 : null), null, CovariateRole.Present));
        }

        var places = new List<NestPlace>();
        foreach (var nest in nests)
        {
            var node = nodeOf[nest.Name];
            var owner = tree.Nodes[node].Owner;
            nodeParameter[node] = nodeParameter[owner];
            var standing = parameters[nodeParameter[owner]].IsFree
                ? (owner == node ? NestStanding.Own : NestStanding.Shared)
                : tree.Nodes[owner].Dissimilarity is null ? NestStanding.NeverWider : NestStanding.FixedByStudy;
            places.Add(new NestPlace(nest.Name, node, nodeParameter[node], standing, tree.ParentOf(tree.Alternatives.Length + node), wide[node]));
        }

        return new ParameterLayout([.. parameters], coefficients, [.. nodeParameter], [.. places]);
    }

    private static ImmutableArray<DesignColumn> ColumnsOf(ImmutableArray<Covariate> covariates, int alternatives)
    {
        var columns = new List<DesignColumn>();
        var stored = 0;
        for (var j = 0; j < alternatives; j++)
            for (var k = 0; k < covariates.Length; k++)
                if (covariates[k].Enters.Contains(j))
                    columns.Add(new DesignColumn(k, j, covariates[k].IsConstant ? -1 : stored++));
        return [.. columns];
    }

    private static ImmutableArray<DesignBlock> BlocksOf(ImmutableArray<int> personStart)
    {
        var blocks = new List<DesignBlock>();
        var first = 0;
        for (var p = 0; p + 1 < personStart.Length; p++)
        {
            var last = p + 2 == personStart.Length;
            if (!last && personStart[p + 2] - first <= TargetLanes) continue;
            var situations = personStart[p + 1] - first;
            var lanes = (situations + ChoiceDesign.TileLanes - 1) / ChoiceDesign.TileLanes * ChoiceDesign.TileLanes;
            blocks.Add(new DesignBlock(blocks.Count, first, situations, lanes));
            first = personStart[p + 1];
        }

        return [.. blocks];
    }
}
