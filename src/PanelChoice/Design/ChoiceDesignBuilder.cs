using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Study;

namespace PanelChoice.Design;

/// <summary>Lays covariates out for the kernels and settles which parameters are free.</summary>
public static class ChoiceDesignBuilder
{
    private const int TargetLanes = 256;

    /// <summary>Builds the design of a covariate set under a nest tree.</summary>
    /// <param name="covariates">Covariates on the estimation sample; every used occasion offers two or more alternatives.</param>
    /// <param name="tree">The nest tree over the panel's alternatives, in the panel's order.</param>
    /// <param name="nests">The study's nests, which give the order of the dissimilarities; same names as in the tree.</param>
    /// <param name="form">The form: a nest that is never wider than one child has no parameter in the utility-scaled one.</param>
    /// <exception cref="ArgumentException">The tree is over other alternatives than the panel.</exception>
    public static ChoiceDesign Build(CovariateSet covariates, NestTree tree, ImmutableArray<NestSpecification> nests, NestedLogitForm form)
    {
        ArgumentNullException.ThrowIfNull(covariates);
        ArgumentNullException.ThrowIfNull(tree);
        var panel = covariates.Panel;
        if (!tree.Alternatives.SequenceEqual(panel.Alternatives))
            throw new ArgumentException("The nest tree and the panel name different alternatives.", nameof(tree));

        var layout = LayOutParameters(covariates, tree, nests, form);
        var columns = Columns(covariates);
        var persons = Persons(covariates);
        var blocks = Blocks(persons.Start);
        var store = new MemoryBlockStore(new BlockFormat(ColumnCodings.Of(columns, covariates.Covariates), panel.Alternatives.Length));
        foreach (var block in blocks) Fill(block, covariates, columns, store.Format, store.Append(block.Lanes));

        var clusterNames = persons.Panel.Select(p => panel.ClusterOf[p]).Distinct().Order().ToList();
        var clusterNumber = clusterNames.Select((c, i) => (c, i)).ToDictionary(x => x.c, x => x.i);
        return new ChoiceDesign(
            tree, layout, columns, blocks, store,
            persons.Start,
            [.. persons.Panel.Select(p => panel.Weight[p])],
            panel.ClusterBy,
            [.. persons.Panel.Select(p => clusterNumber[panel.ClusterOf[p]])],
            [.. clusterNames.Select(c => panel.Clusters[c])]);
    }

    private static ParameterLayout LayOutParameters(
        CovariateSet covariates, NestTree tree, ImmutableArray<NestSpecification> nests, NestedLogitForm form)
    {
        var parameters = new List<ModelParameter>();
        foreach (var c in covariates.Covariates)
            parameters.Add(new ModelParameter(c.Term, c.Alternative, ParameterKind.Coefficient, c.Fixed, c.Start, c.Role));
        var coefficients = parameters.Count;

        var wide = WideSituations(covariates, tree);
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

    private static int[] WideSituations(CovariateSet covariates, NestTree tree)
    {
        var alternatives = tree.Alternatives.Length;
        var wide = new int[tree.Nodes.Length];
        var any = new bool[alternatives + tree.Nodes.Length];
        foreach (var occasion in covariates.Used)
        {
            for (var j = 0; j < alternatives; j++) any[j] = covariates.Panel.Offered[(occasion * alternatives) + j];
            for (var n = 0; n < tree.Nodes.Length; n++)
            {
                var width = tree.Nodes[n].Children.Count(c => any[c]);
                any[alternatives + n] = width > 0;
                if (width > 1) wide[n]++;
            }
        }

        return wide;
    }

    private static ImmutableArray<DesignColumn> Columns(CovariateSet covariates)
    {
        var columns = new List<DesignColumn>();
        var stored = 0;
        for (var j = 0; j < covariates.Panel.Alternatives.Length; j++)
            for (var k = 0; k < covariates.Covariates.Length; k++)
                if (covariates.Covariates[k].Enters.Contains(j))
                    columns.Add(new DesignColumn(k, j, covariates.Covariates[k].IsConstant ? -1 : stored++));
        return [.. columns];
    }

    private static (ImmutableArray<int> Start, ImmutableArray<int> Panel) Persons(CovariateSet covariates)
    {
        var start = new List<int>();
        var panel = new List<int>();
        for (var t = 0; t < covariates.Used.Length; t++)
        {
            var person = covariates.Panel.PersonOf[covariates.Used[t]];
            if (panel.Count > 0 && panel[^1] == person) continue;
            start.Add(t);
            panel.Add(person);
        }

        start.Add(covariates.Used.Length);
        return ([.. start], [.. panel]);
    }

    private static ImmutableArray<DesignBlock> Blocks(ImmutableArray<int> personStart)
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

    private static void Fill(
        DesignBlock block, CovariateSet covariates, ImmutableArray<DesignColumn> columns, BlockFormat format, Span<byte> bytes)
    {
        var panel = covariates.Panel;
        var alternatives = panel.Alternatives.Length;
        var offered = bytes[format.ColumnOffset(format.Columns.Length, block.Lanes)..];
        var chosen = bytes[format.ChosenOffset(block.Lanes)..];
        for (var lane = 0; lane < block.Situations; lane++)
        {
            var occasion = covariates.Used[block.FirstSituation + lane];
            var mask = lane / ChoiceDesign.TileLanes * alternatives;
            var bit = (byte)(1 << (lane % ChoiceDesign.TileLanes));
            for (var j = 0; j < alternatives; j++)
                if (panel.Offered[(occasion * alternatives) + j]) offered[mask + j] |= bit;
            chosen[mask + panel.Chosen[occasion]] |= bit;
        }

        var values = new double[block.Lanes];
        foreach (var column in columns)
        {
            if (column.Storage < 0) continue;
            var covariate = covariates.Covariates[column.Parameter];
            var place = covariate.Enters.IndexOf(column.Alternative);
            for (var lane = 0; lane < block.Situations; lane++)
            {
                var situation = block.FirstSituation + lane;
                var isOffered = panel.Offered[(covariates.Used[situation] * alternatives) + column.Alternative];
                values[lane] = isOffered ? covariate.Values[(situation * covariate.Enters.Length) + place] : 0;
            }

            format.Encode(column.Storage, values, bytes);
        }
    }
}
