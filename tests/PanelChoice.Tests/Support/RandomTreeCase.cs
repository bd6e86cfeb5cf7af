using System.Collections.Immutable;
using MathNet.Numerics.Distributions;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Tests.Support;

/// <summary>A term of a <see cref="RandomTreeCase"/>: one coefficient over some alternatives.</summary>
/// <param name="Enters">Alternatives, ascending.</param>
/// <param name="IsConstant">The covariate is 1.</param>
/// <param name="Value">Situations x J; read only where the term enters.</param>
internal sealed record RandomTerm(int[] Enters, bool IsConstant, double[][] Value);

/// <summary>
/// A small random likelihood problem: a tree up to four nodes deep with free, shared and fixed dissimilarities and nests of any width (one
/// included), terms that enter some alternatives, random availability and choices, persons of unequal length, a point to evaluate at.
/// </summary>
internal sealed record RandomTreeCase(
    string[] Names, ImmutableArray<NestSpecification> Nests, RandomTerm[] Terms, int[] OccasionsOf, bool[][] Offered, int[] Chosen,
    double[] Coefficients, ImmutableDictionary<string, double> Dissimilarity, double[] Weight)
{
    public NestTree Tree => SyntheticPanel.TreeOf([.. Names], Nests);

    public ChoiceDesign Design(NestedLogitForm form) => ChoiceDesignBuilder.Build(Covariates(), Tree, Nests, form);

    /// <summary>The point as a parameter vector.</summary>
    public double[] Point => [.. Coefficients, .. Nests.Where(n => n.SameAs is null).Select(n => Dissimilarity[n.Name])];

    /// <summary>Makes a case.</summary>
    /// <param name="seed">Seed.</param>
    /// <param name="persons">Persons; the last one is four times as long as the longest may otherwise be.</param>
    /// <param name="occasions">Most occasions of a person.</param>
    /// <param name="lowest">Smallest dissimilarity.</param>
    /// <param name="highest">Largest dissimilarity.</param>
    /// <param name="isOrdered">Dissimilarities fall from the root to the alternatives, none above 1, none shared or fixed.</param>
    public static RandomTreeCase Make(
        long seed, int persons = 5, int occasions = 4, double lowest = 0.3, double highest = 1.4, bool isOrdered = false)
    {
        var random = new CounterRandom(seed, "random tree case", 0);
        var alternatives = 3 + random.Next(6);
        var names = Enumerable.Range(0, alternatives).Select(j => ((char)('A' + j)).ToString()).ToArray();
        var nests = RandomNests(random, names, isOrdered, lowest, highest);
        var dissimilarity = RandomDissimilarities(random, nests, isOrdered, lowest, highest);

        var occasionsOf = Enumerable.Range(0, persons).Select(p => p == persons - 1 ? 4 * occasions : 1 + random.Next(occasions)).ToArray();
        var situations = occasionsOf.Sum();
        var offered = new bool[situations][];
        var chosen = new int[situations];
        for (var s = 0; s < situations; s++)
        {
            offered[s] = [.. names.Select(_ => random.NextDouble() < 0.7)];
            var sure = random.Next(alternatives);
            offered[s][sure] = offered[s][(sure + 1) % alternatives] = true;
            do chosen[s] = random.Next(alternatives);
            while (!offered[s][chosen[s]]);
        }

        var terms = new RandomTerm[2 + random.Next(6)];
        for (var k = 0; k < terms.Length; k++)
        {
            int[] enters = [.. Enumerable.Range(0, alternatives).Where(_ => k == 0 || random.Next(2) == 0)];
            var isConstant = k > 0 && random.Next(3) == 0;
            if (isConstant || enters.Length == 0) enters = [random.Next(alternatives)];
            terms[k] = new RandomTerm(
                enters, isConstant,
                [.. offered.Select(row => row.Select((o, j) => isConstant ? 1 : o ? Recorded(Normal.Sample(random, 0, 1), k, j) : 0).ToArray())]);
        }

        return new RandomTreeCase(
            names, nests, terms, occasionsOf, offered, chosen, [.. terms.Select(_ => Normal.Sample(random, 0, 0.8))], dissimilarity,
            [.. occasionsOf.Select(_ => random.Next(4) == 0 ? 0 : 0.5 + random.NextDouble())]);
    }

    /// <summary>Rounds a value as columns of real data are, so that every way in which columns are held occurs: as they are, as short and as long whole numbers, mixed.</summary>
    private static double Recorded(double value, int term, int alternative) => (term % 4) switch
    {
        0 => value,
        1 => Math.Round(value, 2),
        2 => Math.Round(value, 5),
        _ => alternative % 2 == 0 ? value : Math.Round(value),
    };

    /// <summary>The same case with persons, or each person's occasions, in another order.</summary>
    public RandomTreeCase InOrder(int[] persons, bool reverseOccasions)
    {
        var start = new int[OccasionsOf.Length];
        for (var p = 1; p < start.Length; p++) start[p] = start[p - 1] + OccasionsOf[p - 1];
        int[] order = [.. persons.SelectMany(p =>
        {
            var own = Enumerable.Range(start[p], OccasionsOf[p]);
            return reverseOccasions ? own.Reverse() : own;
        })];
        return this with
        {
            OccasionsOf = [.. persons.Select(p => OccasionsOf[p])],
            Weight = [.. persons.Select(p => Weight[p])],
            Offered = [.. order.Select(s => Offered[s])],
            Chosen = [.. order.Select(s => Chosen[s])],
            Terms = [.. Terms.Select(t => t with { Value = [.. order.Select(s => t.Value[s])] })],
        };
    }

    /// <summary>The same case with alternatives in another order; alternative <c>order[i]</c> comes to stand at place i.</summary>
    public RandomTreeCase WithAlternatives(int[] order)
    {
        double[][] Sort(double[][] rows) => [.. rows.Select(row => order.Select(j => row[j]).ToArray())];
        return this with
        {
            Names = [.. order.Select(j => Names[j])],
            Offered = [.. Offered.Select(row => order.Select(j => row[j]).ToArray())],
            Chosen = [.. Chosen.Select(j => Array.IndexOf(order, j))],
            Terms = [.. Terms.Select(t => t with { Enters = [.. t.Enters.Select(j => Array.IndexOf(order, j)).Order()], Value = Sort(t.Value) })],
        };
    }

    /// <summary>The same case without one nest: its members move up into its parent.</summary>
    public RandomTreeCase Without(string nest)
    {
        var gone = Nests.Single(n => n.Name == nest);
        return this with
        {
            Nests = [.. Nests.Where(n => n != gone).Select(n => n with
            {
                Members = n.Members.Contains(nest) ? [.. n.Members.Where(m => m != nest), .. gone.Members] : n.Members,
            })],
        };
    }

    /// <summary>The same case with at most one alternative offered below a nest: the chosen one where it lies there, else the first.</summary>
    public RandomTreeCase WithOneOfferedUnder(string nest)
    {
        var tree = Tree;
        var under = tree.AlternativesUnder(Enumerable.Range(0, tree.Nodes.Length).First(n => tree.Nodes[n].Name == nest)).ToHashSet();
        return this with
        {
            Offered = [.. Offered.Select((row, s) =>
            {
                var kept = under.Contains(Chosen[s]) ? Chosen[s] : Enumerable.Range(0, row.Length).FirstOrDefault(j => under.Contains(j) && row[j], -1);
                return row.Select((o, j) => o && (!under.Contains(j) || j == kept)).ToArray();
            })],
        };
    }

    private CovariateSet Covariates()
    {
        var covariates = Terms.Select((t, k) => new Covariate(
            $"term {k + 1}", null, [.. t.Enters],
            t.IsConstant ? [] : [.. t.Value.SelectMany(row => t.Enters.Select(j => row[j]))],
            t.IsConstant, CovariateRole.Present, null, null, k));
        return new CovariateSet(Panel(), [.. Enumerable.Range(0, Chosen.Length)], [.. covariates], [], [], []);
    }

    private ChoicePanel Panel()
    {
        var table = new ChoiceTable(
            "random", new string('0', 64), [], new CodedColumn([], []), OccasionKind.WholeNumber, [], new CodedColumn([], [.. Names]), [], [], [],
            ImmutableDictionary<string, ImmutableArray<double>>.Empty, ImmutableDictionary<string, CodedColumn>.Empty);
        ImmutableArray<string> ids = [.. OccasionsOf.Select((_, p) => $"P{p + 1:D4}")];
        var start = new int[OccasionsOf.Length + 1];
        for (var p = 0; p < OccasionsOf.Length; p++) start[p + 1] = start[p] + OccasionsOf[p];
        return new ChoicePanel(
            table, ids, [.. Names], [.. start],
            [.. OccasionsOf.SelectMany((n, p) => Enumerable.Repeat(p, n))],
            [.. OccasionsOf.SelectMany(n => Enumerable.Range(1, n).Select(t => (long)t))],
            [], [.. Offered.SelectMany(row => row)], [.. Chosen], [.. Weight.Select(_ => 1.0)], "person", ids, [.. OccasionsOf.Select((_, p) => p)]);
    }

    private static ImmutableArray<NestSpecification> RandomNests(CounterRandom random, string[] names, bool isOrdered, double lowest, double highest)
    {
        const int DeepestNest = 3;
        var top = names.Select(n => (Name: n, Depth: 0)).ToList();
        var nests = new List<NestSpecification>();
        var wanted = random.Next(6);
        for (var i = 0; i < wanted && top.Count > 1; i++)
        {
            var members = top.OrderBy(_ => random.NextUInt32()).Take(1 + random.Next(3)).ToList();
            var depth = 1 + members.Max(m => m.Depth);
            if (depth > DeepestNest) continue;
            var owners = nests.Where(n => n.SameAs is null).ToList();
            var sameAs = !isOrdered && owners.Count > 0 && random.Next(4) == 0 ? owners[random.Next(owners.Count)].Name : null;
            double? dissimilarity = !isOrdered && sameAs is null && random.Next(6) == 0 ? lowest + ((highest - lowest) * random.NextDouble()) : null;
            nests.Add(new NestSpecification($"nest {i + 1}", [.. members.Select(m => m.Name)], dissimilarity, sameAs, 0));
            top.RemoveAll(members.Contains);
            top.Add(($"nest {i + 1}", depth));
        }

        return [.. nests];
    }

    private static ImmutableDictionary<string, double> RandomDissimilarities(
        CounterRandom random, ImmutableArray<NestSpecification> nests, bool isOrdered, double lowest, double highest)
    {
        var all = ImmutableDictionary.CreateBuilder<string, double>();
        // A nest is always listed after the nests inside it, so that backwards parents come first.
        foreach (var nest in nests.Reverse())
        {
            if (nest.SameAs is not null) continue;
            var parent = nests.SingleOrDefault(n => n.Members.Contains(nest.Name));
            all[nest.Name] = nest.Dissimilarity ?? (isOrdered
                ? (parent is null ? 1 : all[parent.Name]) * (0.4 + (0.6 * random.NextDouble()))
                : lowest + ((highest - lowest) * random.NextDouble()));
        }

        return all.ToImmutable();
    }
}
