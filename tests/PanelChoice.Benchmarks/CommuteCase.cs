using System.Collections.Immutable;
using MathNet.Numerics.Distributions;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>
/// A seeded synthetic commute panel of fixed size: constants, two generic attributes, the last choice, (in the large case) a habit stock,
/// waiting time for two alternatives, terms of single alternatives, two nests of two, lasting tastes, unavailable alternatives.
/// </summary>
internal sealed record CommuteCase(string Name, CovariateSet Covariates, NestTree Tree, ImmutableArray<NestSpecification> Nests, double[] Truth)
{
    private static readonly string[] Modes = ["car", "rail", "bus", "bike", "walk", "ferry"];
    private static readonly double[] OfferedShare = [0.85, 0.80, 1, 0.90, 1, 1];

    /// <summary>500 persons x 20 occasions x 5 alternatives, 12 parameters.</summary>
    public static CommuteCase Small() => Make("S", 500, 20, 5, hasStock: false, singles: 2);

    /// <summary>10,000 persons x 30 occasions x 6 alternatives, 15 parameters.</summary>
    public static CommuteCase Medium() => Make("M", 10_000, 30, 6, hasStock: true, singles: 3);

    /// <summary>The design for the kernels.</summary>
    public ChoiceDesign Design() => ChoiceDesignBuilder.Build(Covariates, Tree, Nests, NestedLogitForm.UtilityScaled);

    private static CommuteCase Make(string name, int persons, int occasions, int alternatives, bool hasStock, int singles)
    {
        var names = Modes.Take(alternatives).ToImmutableArray();
        ImmutableArray<NestSpecification> nests =
            [new("private", ["car", "bike"], null, null, 0), new("public", ["rail", "bus"], null, null, 0)];
        var top = Enumerable.Range(4, alternatives - 4).Append(alternatives).Append(alternatives + 1).ToImmutableArray();
        var tree = new NestTree(
            names, [new("private", [0, 3], null, 0), new("public", [1, 2], null, 1), new("", top, 1, 2)]);

        var count = persons * occasions;
        var cells = count * alternatives;
        var (time, cost, last, stock) = (new double[cells], new double[cells], new double[cells], new double[cells]);
        var wait = new double[count * 2];
        var single = Enumerable.Range(0, singles).Select(_ => new double[count]).ToArray();
        var offered = new bool[cells];
        var chosen = new int[count];
        double[] truth =
        [
            .. Enumerable.Range(1, alternatives - 1).Select(j => 0.4 * Math.Cos(j)), -0.6, -0.3, 0.8, .. hasStock ? [0.5] : Array.Empty<double>(), -0.4,
            .. Enumerable.Range(0, singles).Select(s => 0.3 - (0.2 * s)), 0.6, 0.75,
        ];

        var probabilities = new TreeProbabilities(tree, NestedLogitForm.UtilityScaled);
        probabilities.SetDissimilarities([truth[^2], truth[^1], 1]);
        for (var person = 0; person < persons; person++) Simulate(person);

        var all = Enumerable.Range(0, alternatives).ToImmutableArray();
        var covariates = new List<Covariate>();
        for (var j = 1; j < alternatives; j++) Add("constant", [j], [], true, names[j]);
        Add("time", all, time);
        Add("cost", all, cost);
        Add("same as last time", all, last);
        if (hasStock) Add("habit", all, stock);
        Add("wait", [1, 2], wait);
        for (var s = 0; s < singles; s++) Add($"single {s + 1}", [s], single[s]);
        var panel = PanelOf(names, persons, occasions, offered, chosen);
        return new CommuteCase(name, new CovariateSet(panel, [.. Enumerable.Range(0, count)], [.. covariates], [], [], []), tree, nests, truth);

        void Add(string term, ImmutableArray<int> enters, double[] values, bool isConstant = false, string? alternative = null) => covariates.Add(
            new Covariate(term, alternative, enters, [.. values], isConstant, CovariateRole.Present, null, null, covariates.Count));

        void Simulate(int person)
        {
            var random = new CounterRandom(20310401, "benchmark panel", person);
            var utility = new double[alternatives];
            var share = Enumerable.Repeat(1.0 / alternatives, alternatives).ToArray();
            var taste = utility.Select(_ => 0.7 * Normal.Sample(random, 0, 1)).ToArray();
            var isOwned = OfferedShare.Select(p => random.NextDouble() < p).ToArray();
            for (var t = 0; t < occasions; t++)
            {
                var o = (person * occasions) + t;
                for (var j = 0; j < alternatives; j++)
                {
                    var cell = (o * alternatives) + j;
                    offered[cell] = isOwned[j];
                    time[cell] = 1 + random.NextDouble();
                    cost[cell] = 2 * random.NextDouble();
                    last[cell] = t > 0 && chosen[o - 1] == j ? 1 : 0;
                    stock[cell] = share[j];
                    var k = alternatives - 1;
                    utility[j] = (j > 0 ? truth[j - 1] : 0) + taste[j] + (truth[k++] * time[cell]) + (truth[k++] * cost[cell]) + (truth[k++] * last[cell]);
                    if (hasStock) utility[j] += truth[k++] * stock[cell];
                    if (j is 1 or 2) utility[j] += truth[k] * (wait[(o * 2) + j - 1] = random.NextDouble());
                    k++;
                    if (j < singles) utility[j] += truth[k + j] * (single[j][o] = random.NextDouble());
                }

                probabilities.Compute(utility, offered.AsSpan(o * alternatives, alternatives));
                chosen[o] = Categorical.Sample(random, probabilities.Probability[..alternatives]);
                for (var j = 0; j < alternatives; j++) share[j] = (0.8 * share[j]) + (chosen[o] == j ? 0.2 : 0);
            }
        }
    }

    private static ChoicePanel PanelOf(ImmutableArray<string> names, int persons, int occasions, bool[] offered, int[] chosen)
    {
        var table = new ChoiceTable(
            "synthetic", new string('0', 64), [], new CodedColumn([], []), OccasionKind.WholeNumber, [], new CodedColumn([], names), [], [], [],
            ImmutableDictionary<string, ImmutableArray<double>>.Empty, ImmutableDictionary<string, CodedColumn>.Empty);
        var ids = Enumerable.Range(1, persons).Select(p => p.ToString(System.Globalization.CultureInfo.InvariantCulture)).ToImmutableArray();
        return new ChoicePanel(
            table, ids, names,
            [.. Enumerable.Range(0, persons + 1).Select(p => p * occasions)],
            [.. Enumerable.Range(0, chosen.Length).Select(o => o / occasions)],
            [.. Enumerable.Range(0, chosen.Length).Select(o => (long)(o % occasions) + 1)],
            [], [.. offered], [.. chosen], [.. Enumerable.Repeat(1.0, persons)], "person", ids, [.. Enumerable.Range(0, persons)]);
    }
}
