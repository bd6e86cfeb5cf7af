using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Tests.Support;

/// <summary>
/// Small seeded panels for tests of the later stages, made without files: random attributes, random availability, choices drawn from the
/// nested logit at known parameters. Coefficients: a constant for each alternative but the first, then generic attributes, then (if asked for)
/// the last choice.
/// </summary>
internal sealed record SyntheticPanel(ChoicePanel Panel, CovariateSet Covariates, NestTree Tree, ImmutableArray<NestSpecification> Nests, double[] Truth)
{
    public ChoiceDesign Design(NestedLogitForm form = NestedLogitForm.UtilityScaled) =>
        ChoiceDesignBuilder.Build(Covariates, Tree, Nests, form);

    /// <summary>Makes a panel.</summary>
    /// <param name="seed">Seed.</param>
    /// <param name="persons">Persons.</param>
    /// <param name="occasions">Occasions for each.</param>
    /// <param name="alternatives">Alternatives; the tree's names must be A, B, C, ...</param>
    /// <param name="nests">Nests over names A, B, C, ... and over each other.</param>
    /// <param name="dissimilarities">True value of each nest that has its own parameter, in the order of <paramref name="nests"/>.</param>
    /// <param name="attributes">Generic attributes with coefficients -1, +1, -1, ... times one half.</param>
    /// <param name="offeredShare">Probability that an alternative is offered (two are always).</param>
    /// <param name="habit">True coefficient of the last choice; null leaves the term out.</param>
    /// <param name="tasteSd">Standard deviation of a person's lasting taste for each alternative.</param>
    public static SyntheticPanel Make(
        int seed, int persons, int occasions, int alternatives, ImmutableArray<NestSpecification> nests, double[] dissimilarities,
        int attributes = 2, double offeredShare = 0.85, double? habit = null, double tasteSd = 0)
    {
        var random = new CounterRandom(seed, "synthetic panel", 0);
        var names = Enumerable.Range(0, alternatives).Select(j => ((char)('A' + j)).ToString()).ToImmutableArray();
        var tree = TreeOf(names, nests);
        var coefficients = alternatives - 1 + attributes + (habit is null ? 0 : 1);
        var truth = new double[coefficients + dissimilarities.Length];
        for (var j = 1; j < alternatives; j++) truth[j - 1] = 0.3 * Math.Sin(j);
        for (var a = 0; a < attributes; a++) truth[alternatives - 1 + a] = (a % 2 == 0 ? -1 : 1) * 0.5;
        if (habit is { } h) truth[alternatives - 1 + attributes] = h;
        dissimilarities.CopyTo(truth, coefficients);

        var l = new double[tree.Nodes.Length];
        var next = 0;
        Array.Fill(l, 1);
        foreach (var nest in nests)
        {
            var node = NodeNamed(tree, nest.Name);
            if (tree.Nodes[node].Owner == node) l[node] = tree.Nodes[node].Dissimilarity ?? dissimilarities[next++];
        }

        for (var n = 0; n < l.Length; n++) l[n] = l[tree.Nodes[n].Owner];
        var probabilities = new TreeProbabilities(tree, NestedLogitForm.UtilityScaled);
        probabilities.SetDissimilarities(l);

        var count = persons * occasions;
        var offered = new bool[count * alternatives];
        var chosen = new int[count];
        var values = Enumerable.Range(0, attributes).Select(_ => new double[count * alternatives]).ToArray();
        var last = new double[count * alternatives];
        var utility = new double[alternatives];
        for (var p = 0; p < persons; p++)
        {
            var taste = Enumerable.Range(0, alternatives).Select(_ => tasteSd * MathNet.Numerics.Distributions.Normal.Sample(random, 0, 1)).ToArray();
            for (var t = 0; t < occasions; t++)
            {
                var o = (p * occasions) + t;
                var cell = o * alternatives;
                for (var j = 0; j < alternatives; j++) offered[cell + j] = random.NextDouble() < offeredShare;
                var sure = random.Next(alternatives);
                offered[cell + sure] = offered[cell + ((sure + 1) % alternatives)] = true;
                for (var j = 0; j < alternatives; j++)
                {
                    utility[j] = (j > 0 ? truth[j - 1] : 0) + taste[j];
                    for (var a = 0; a < attributes; a++)
                    {
                        var x = MathNet.Numerics.Distributions.Normal.Sample(random, 0, 1);
                        values[a][cell + j] = offered[cell + j] ? x : 0;
                        utility[j] += truth[alternatives - 1 + a] * x;
                    }

                    if (t > 0 && chosen[o - 1] == j)
                    {
                        if (offered[cell + j]) last[cell + j] = 1;
                        utility[j] += habit ?? 0;
                    }
                }

                probabilities.Compute(utility, offered.AsSpan(cell, alternatives));
                var draw = random.NextDouble();
                var j0 = -1;
                for (var j = 0; j < alternatives && draw >= 0; j++)
                {
                    if (!offered[cell + j]) continue;
                    j0 = j;
                    draw -= probabilities.Probability[j];
                }

                chosen[o] = j0;
            }
        }

        var panel = PanelOf(names, persons, occasions, offered, chosen);
        var all = Enumerable.Range(0, alternatives).ToImmutableArray();
        var covariates = new List<Covariate>();
        for (var j = 1; j < alternatives; j++)
            covariates.Add(new Covariate("constant", names[j], [j], [], true, CovariateRole.Present, null, null, 0));
        for (var a = 0; a < attributes; a++)
            covariates.Add(new Covariate($"attribute {a + 1}", null, all, [.. values[a]], false, CovariateRole.Present, null, null, 1 + a));
        if (habit is not null)
            covariates.Add(new Covariate("same as last time", null, all, [.. last], false, CovariateRole.PastChoice, null, null, 1 + attributes));
        return new SyntheticPanel(
            panel, new CovariateSet(panel, [.. Enumerable.Range(0, count)], [.. covariates], [], [], []), tree, nests, truth);
    }

    /// <summary>A nest with a free dissimilarity of its own.</summary>
    public static NestSpecification Nest(string name, params string[] members) => new(name, [.. members], null, null, 0);

    private static int NodeNamed(NestTree tree, string name) => Enumerable.Range(0, tree.Nodes.Length).First(n => n != tree.Root && tree.Nodes[n].Name == name);

    /// <summary>The tree of some nests, children before parents; members may be nests listed anywhere.</summary>
    public static NestTree TreeOf(ImmutableArray<string> names, ImmutableArray<NestSpecification> nests)
    {
        var order = new List<NestSpecification>();
        void Visit(NestSpecification nest)
        {
            foreach (var inner in nests.Where(n => nest.Members.Contains(n.Name))) Visit(inner);
            if (!order.Contains(nest)) order.Add(nest);
        }

        foreach (var nest in nests) Visit(nest);
        int Child(string member) => names.Contains(member) ? names.IndexOf(member) : names.Length + order.FindIndex(n => n.Name == member);
        var nodes = order.Select((n, i) => new NestNode(
            n.Name, [.. n.Members.Select(Child)], n.Dissimilarity, n.SameAs is null ? i : order.FindIndex(o => o.Name == n.SameAs))).ToList();
        var listed = nests.SelectMany(n => n.Members).ToHashSet();
        var top = names.Concat(order.Select(n => n.Name)).Where(n => !listed.Contains(n)).Select(Child).ToImmutableArray();
        nodes.Add(new NestNode("", top, 1, nodes.Count));
        return new NestTree(names, [.. nodes]);
    }

    private static ChoicePanel PanelOf(ImmutableArray<string> names, int persons, int occasions, bool[] offered, int[] chosen)
    {
        var alternatives = names.Length;
        var count = persons * occasions;
        var cells = count * alternatives;
        var ids = Enumerable.Range(1, persons).Select(p => p.ToString(System.Globalization.CultureInfo.InvariantCulture)).ToImmutableArray();
        var table = new ChoiceTable(
            "synthetic", new string('0', 64),
            [.. Enumerable.Range(0, cells).Select(i => (long)i + 2)],
            new CodedColumn([.. Enumerable.Range(0, cells).Select(i => i / (occasions * alternatives))], ids),
            OccasionKind.WholeNumber,
            [.. Enumerable.Range(0, cells).Select(i => (long)(i / alternatives % occasions) + 1)],
            new CodedColumn([.. Enumerable.Range(0, cells).Select(i => i % alternatives)], names),
            [.. Enumerable.Range(0, cells).Select(i => chosen[i / alternatives] == i % alternatives)],
            [.. offered],
            [],
            ImmutableDictionary<string, ImmutableArray<double>>.Empty,
            ImmutableDictionary<string, CodedColumn>.Empty);
        return new ChoicePanel(
            table, ids, names,
            [.. Enumerable.Range(0, persons + 1).Select(p => p * occasions)],
            [.. Enumerable.Range(0, count).Select(o => o / occasions)],
            [.. Enumerable.Range(0, count).Select(o => (long)(o % occasions) + 1)],
            [.. Enumerable.Range(0, cells)],
            [.. offered],
            [.. chosen],
            [.. Enumerable.Repeat(1.0, persons)],
            "person", ids, [.. Enumerable.Range(0, persons)]);
    }
}
