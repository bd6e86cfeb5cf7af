using System.Collections.Immutable;
using MathNet.Numerics.Distributions;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Tests.Support;

/// <summary>What moves the simulated people besides the attributes; zero everywhere is an independent panel.</summary>
internal sealed record CommuteProcess
{
    /// <summary>Coefficient of the last choice.</summary>
    public double Habit { get; init; }

    /// <summary>Standard deviation of a person's lasting taste for each alternative.</summary>
    public double TasteSd { get; init; }

    /// <summary>Standard deviation of a person's lasting taste for each nest.</summary>
    public double NestTasteSd { get; init; }

    /// <summary>Autocorrelation of the Gaussian process behind every error's uniform.</summary>
    public double ErrorCorrelation { get; init; }

    /// <summary>Standard deviation of a shock to each alternative that everybody shares on a date.</summary>
    public double DateSd { get; init; }

    /// <summary>Autocorrelation of that shock from date to date.</summary>
    public double DateCorrelation { get; init; }

    /// <summary>Share of the persons who hold a pass.</summary>
    public double PassShare { get; init; } = 0.5;
}

/// <summary>
/// Seeded panels of commuters for the size and power of the independence battery. Five alternatives, nests {A, B} with dissimilarity 0.6
/// and {C, D} with 0.7, E alone; V = constant - 0.6 cost - 0.8 time + 0.5 pass on A and B (+ habit on the last choice). Half the
/// variance of cost and a quarter of that of time is between persons, the rest of time follows an autoregression of 0.5; pass is 0 or 1,
/// constant within a person (half the persons hold one unless the process says otherwise). Fifteen days run before the record begins. Errors are
/// exact nested logit errors, Gumbel variables times a positive stable variable for each nest (the stable variable by Kanter's 1975 representation);
/// serially correlated errors put a Gaussian autoregression on every underlying uniform, so that each single day is exactly the fitted model.
/// </summary>
internal sealed record SimulatedCommutes(StudySpecification Study, CovariateSet Covariates, NestTree Tree, ImmutableArray<double> Truth)
{
    private const int J = 5;
    private const int BurnIn = 15;
    private static readonly ImmutableArray<string> Names = ["A", "B", "C", "D", "E"];
    private static readonly int[] NestOf = [0, 0, 1, 1, 2];
    private static readonly double[] Lambda = [0.6, 0.7, 1];
    private static readonly double[] Constants = [0, 0.2, -0.1, 0.3, 0.1];
    private static readonly ImmutableArray<NestSpecification> Nests =
        [new("first", ["A", "B"], null, null, 0), new("second", ["C", "D"], null, null, 0)];

    /// <summary>The kernel layout.</summary>
    public ChoiceDesign Design => ChoiceDesignBuilder.Build(Covariates, Tree, Study.Nests, Study.Estimate.Form);

    /// <summary>Makes panel number <paramref name="index"/>.</summary>
    /// <param name="persons">Persons.</param>
    /// <param name="occasions">Occasions of each in the estimation sample.</param>
    /// <param name="process">What moves them.</param>
    /// <param name="lastChoice">Whether the model has the last choice; then the record starts one day earlier, as history.</param>
    /// <param name="seed">Seed.</param>
    /// <param name="index">Number of the panel.</param>
    public static SimulatedCommutes Make(int persons, int occasions, CommuteProcess process, bool lastChoice, long seed, long index)
    {
        var recorded = occasions + (lastChoice ? 1 : 0);
        var count = persons * recorded;
        var chosen = new int[count];
        double[] cost = new double[count * J], time = new double[count * J], pass = new double[count * J];
        var dateShock = DateShocks(BurnIn + occasions, process, new CounterRandom(seed, "date shocks", index));
        for (var person = 0; person < persons; person++)
            Live(person, BurnIn + occasions - recorded, process, dateShock, new CounterRandom(seed, "commuter", (index << 20) + person),
                chosen.AsSpan(person * recorded, recorded),
                cost.AsSpan(person * recorded * J), time.AsSpan(person * recorded * J), pass.AsSpan(person * recorded * J));

        var panel = Record(persons, recorded, lastChoice ? 0 : 1, chosen, cost, time, pass);
        ImmutableArray<int> used = [.. Enumerable.Range(0, count).Where(o => !lastChoice || o % recorded > 0)];
        ImmutableArray<int> all = [0, 1, 2, 3, 4];
        var covariates = new List<Covariate>();
        for (var j = 1; j < J; j++) covariates.Add(new("constant", Names[j], [j], [], true, CovariateRole.Present, null, null, 0));
        covariates.Add(new("cost", null, all, Used(used, cost), false, CovariateRole.Present, null, null, 1));
        covariates.Add(new("time", null, all, Used(used, time), false, CovariateRole.Present, null, null, 2));
        covariates.Add(new("pass", null, [0, 1], [.. used.SelectMany(o => new[] { pass[o * J], pass[o * J] })], false, CovariateRole.Present, null, null, 3));
        if (lastChoice)
            covariates.Add(new(
                "same as last time", null, all, [.. used.SelectMany(o => Enumerable.Range(0, J).Select(j => chosen[o - 1] == j ? 1.0 : 0))],
                false, CovariateRole.PastChoice, null, null, 4));
        double[] truth = [.. Constants.Skip(1), -0.6, -0.8, 0.5, .. lastChoice ? new[] { process.Habit } : [], 0.6, 0.7];
        var study = StudyOf(lastChoice);
        return new SimulatedCommutes(
            study, new CovariateSet(panel, used, [.. covariates], [], [], []), NestTreeBuilder.Build(study, Names).Value!, [.. truth]);
    }

    private static double[][] DateShocks(int days, CommuteProcess process, CounterRandom random)
    {
        var shock = new double[days][];
        var (keep, fresh) = (process.DateCorrelation, Math.Sqrt(1 - (process.DateCorrelation * process.DateCorrelation)));
        for (var day = 0; day < days; day++)
            shock[day] = process.DateSd == 0
                ? new double[J]
                : [.. Enumerable.Range(0, J).Select(j => day == 0
                    ? process.DateSd * Normal.Sample(random, 0, 1)
                    : (keep * shock[day - 1][j]) + (fresh * process.DateSd * Normal.Sample(random, 0, 1)))];
        return shock;
    }

    private static void Live(
        int person, int firstRecorded, CommuteProcess process, double[][] dateShock, CounterRandom random,
        Span<int> chosen, Span<double> cost, Span<double> time, Span<double> pass)
    {
        double Draw() => Normal.Sample(random, 0, 1);
        double[] taste = new double[J], ownCost = new double[J], ownTime = new double[J], drift = new double[J];
        var nestTaste = new double[3];
        for (var m = 0; m < 3; m++) nestTaste[m] = process.NestTasteSd * Draw();
        for (var j = 0; j < J; j++)
        {
            taste[j] = (process.TasteSd * Draw()) + nestTaste[NestOf[j]];
            ownCost[j] = Math.Sqrt(0.5) * Draw();
            ownTime[j] = Math.Sqrt(0.25) * Draw();
            drift[j] = Draw();
        }

        var holder = random.NextDouble() < process.PassShare ? 1.0 : 0.0;
        var errors = new NestedErrors(process.ErrorCorrelation, random);
        var last = -1;
        for (var day = 0; day < dateShock.Length; day++)
        {
            errors.Next();
            var best = double.NegativeInfinity;
            var choice = -1;
            for (var j = 0; j < J; j++)
            {
                drift[j] = (0.5 * drift[j]) + (Math.Sqrt(0.75) * Draw());
                var c = ownCost[j] + (Math.Sqrt(0.5) * Draw());
                var t = ownTime[j] + (Math.Sqrt(0.75) * drift[j]);
                var u = Constants[j] - (0.6 * c) - (0.8 * t) + (NestOf[j] == 0 ? 0.5 * holder : 0) + (last == j ? process.Habit : 0)
                    + taste[j] + dateShock[day][j] + errors.Value[j];
                if (day >= firstRecorded)
                {
                    var cell = ((day - firstRecorded) * J) + j;
                    (cost[cell], time[cell], pass[cell]) = (c, t, holder);
                }

                if (u > best) (best, choice) = (u, j);
            }

            last = choice;
            if (day >= firstRecorded) chosen[day - firstRecorded] = choice;
        }
    }

    private static ImmutableArray<double> Used(ImmutableArray<int> used, double[] cells) =>
        [.. used.SelectMany(o => Enumerable.Range(o * J, J).Select(c => cells[c]))];

    private static ChoicePanel Record(int persons, int recorded, int firstOccasion, int[] chosen, double[] cost, double[] time, double[] pass)
    {
        var count = persons * recorded;
        var cells = count * J;
        ImmutableArray<string> ids = [.. Enumerable.Range(1, persons).Select(p => p.ToString(System.Globalization.CultureInfo.InvariantCulture))];
        ImmutableArray<bool> offered = [.. Enumerable.Repeat(true, cells)];
        var table = new ChoiceTable(
            "simulated", new string('0', 64),
            [.. Enumerable.Range(0, cells).Select(i => (long)i + 2)],
            new CodedColumn([.. Enumerable.Range(0, cells).Select(i => i / (recorded * J))], ids),
            OccasionKind.WholeNumber,
            [.. Enumerable.Range(0, cells).Select(i => (long)((i / J % recorded) + firstOccasion))],
            new CodedColumn([.. Enumerable.Range(0, cells).Select(i => i % J)], Names),
            [.. Enumerable.Range(0, cells).Select(i => chosen[i / J] == i % J)],
            offered,
            [],
            new Dictionary<string, ImmutableArray<double>> { ["cost"] = [.. cost], ["time"] = [.. time], ["pass"] = [.. pass] }.ToImmutableDictionary(),
            ImmutableDictionary<string, CodedColumn>.Empty);
        return new ChoicePanel(
            table, ids, Names,
            [.. Enumerable.Range(0, persons + 1).Select(p => p * recorded)],
            [.. Enumerable.Range(0, count).Select(o => o / recorded)],
            [.. Enumerable.Range(0, count).Select(o => (long)((o % recorded) + firstOccasion))],
            [.. Enumerable.Range(0, cells)],
            offered,
            [.. chosen],
            [.. Enumerable.Repeat(1.0, persons)],
            "person", ids, [.. Enumerable.Range(0, persons)]);
    }

    private static StudySpecification StudyOf(bool lastChoice)
    {
        static TermSpecification Term(string name, TermSource source, params string[] alternatives) =>
            new(name, source, [.. alternatives], false, null, null, false, 1, null, null, 0);
        var terms = new List<TermSpecification>
        {
            Term("constant", new ConstantSource()) with { Each = true, Base = "A" },
            Term("cost", new ColumnSource("cost", new Now(), null, false, null)),
            Term("time", new ColumnSource("time", new Now(), null, false, null)),
            Term("pass", new ColumnSource("pass", new Now(), null, false, null), "A", "B"),
        };
        if (lastChoice) terms.Add(Term("same as last time", new LastChoiceSource(1)));
        return new StudySpecification(
            "simulated commutes", "simulated", "", new string('0', 64),
            new PanelSource("simulated", "simulated", "person", "day", "mode", "taken", null, null, true),
            new HistorySpecification(lastChoice ? PreviousRule.Step : null, [], null, MissingHistory.Drop),
            Nests, [.. terms],
            new EstimateSettings(NestedLogitForm.UtilityScaled, 1, 7),
            new InferenceSettings("person", 0.95, JackknifeKind.Off, 0, 7),
            new DiagnosticsSettings(5, 0.05, 2999, 7));
    }

    /// <summary>
    /// Errors whose joint distribution is the nested logit's: l_m (log S_m + Gumbel_j) with S_m positive stable of index l_m, because the
    /// Laplace transform of S_m is exp(-t^l) and so P(all errors below x) = exp(-sum over nests of (sum exp(-x_j / l))^l).
    /// </summary>
    private sealed class NestedErrors(double correlation, CounterRandom random)
    {
        private readonly double[] gauss = new double[J + 4];
        private bool started;

        public double[] Value { get; } = new double[J];

        public void Next()
        {
            for (var m = 0; m < 3; m++)
            {
                var logStable = m < 2 ? LogStable(Lambda[m], Math.PI * Uniform(J + (2 * m)), -Math.Log(Uniform(J + (2 * m) + 1))) : 0;
                for (var j = 0; j < J; j++)
                    if (NestOf[j] == m) Value[j] = Lambda[m] * (logStable - Math.Log(-Math.Log(Uniform(j))));
            }

            started = true;
        }

        private static double LogStable(double index, double angle, double exponential) =>
            Math.Log(Math.Sin(index * angle)) - (Math.Log(Math.Sin(angle)) / index)
            + ((1 - index) / index * (Math.Log(Math.Sin((1 - index) * angle)) - Math.Log(exponential)));

        private double Uniform(int i)
        {
            if (correlation == 0) return random.NextDouble();
            var fresh = Normal.Sample(random, 0, 1);
            gauss[i] = started ? (correlation * gauss[i]) + (Math.Sqrt(1 - (correlation * correlation)) * fresh) : fresh;
            return Math.Clamp(Normal.CDF(0, 1, gauss[i]), 1e-300, 1 - 1e-16);
        }
    }
}
