using System.Collections.Immutable;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Design;
using PanelChoice.Diagnostics;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Diagnostics;

/// <summary>Every moment, its variance and its bias against plain double loops that share no code with the library.</summary>
public class MomentTests
{
    private const double SameMethod = 1e-9;
    private const int Persons = 7;
    private const int Occasions = 6;
    private const int Lags = 6;
    private static readonly int[] NestOf = [0, 0, 1, 1, -1];

    private readonly SyntheticPanel made;
    private readonly ChoiceDesign design;
    private readonly ImmutableArray<double> theta;
    private readonly OccasionPositions positions;
    private readonly ImmutableArray<long> at;
    private readonly ImmutableArray<long> dates;
    private readonly BruteForce brute;
    private readonly ScoreBattery battery;

    public MomentTests()
    {
        made = SyntheticPanel.Make(
            5, Persons, Occasions, 5, [SyntheticPanel.Nest("first", "A", "B"), SyntheticPanel.Nest("second", "C", "D")], [0.6, 0.75], habit: 0.6);
        design = made.Design();
        // Off the truth and off the maximum on purpose: the total score must be projected out.
        theta = [.. made.Truth.Select((x, k) => x + (0.05 * Math.Cos(k)))];
        var random = new CounterRandom(3, "gaps", 0);
        var days = new long[design.Situations];
        for (var t = 0; t < days.Length; t++) days[t] = t % Occasions == 0 ? random.Next(3) : days[t - 1] + 1 + (random.Next(3) == 0 ? random.Next(4) : 0);
        at = [.. days];
        positions = new OccasionPositions(at, [.. new int[at.Length]], 1, "step");
        dates = at;
        brute = Brute(theta);
        battery = ScoreBattery.Compute(design, NestedLogitForm.UtilityScaled, theta, positions, Lags, CompactNumbers.Of(dates), false, 1)!;
    }

    [Fact]
    public void Decay_scores_equal_double_loops()
    {
        for (var r = 0; r < PersonHistory.Decays.Length; r++)
        {
            var rho = PersonHistory.Decays[r];
            Same(brute.Moment((t, s, j, k) => j == k && Earlier(t, s) ? Math.Pow(rho, Gap(t, s) - 1) : 0), battery.Decays[r]);
        }
    }

    [Fact]
    public void The_decays_covariance_equals_that_of_their_sums()
    {
        // Var(a + b) - Var(a - b) = 4 Cov(a, b), so that the off-diagonal is checked through moments of their own.
        for (var r = 0; r < PersonHistory.Decays.Length; r++)
            for (var q = 0; q < r; q++)
            {
                double Weight(int t, int s, int j, int k, double sign) => j == k && Earlier(t, s)
                    ? Math.Pow(PersonHistory.Decays[r], Gap(t, s) - 1) + (sign * Math.Pow(PersonHistory.Decays[q], Gap(t, s) - 1))
                    : 0;
                var sum = brute.Moment((t, s, j, k) => Weight(t, s, j, k, 1)).Variance;
                var difference = brute.Moment((t, s, j, k) => Weight(t, s, j, k, -1)).Variance;
                Close((sum - difference) / 4, battery.DecayCovariance[(r * PersonHistory.Decays.Length) + q], sum);
            }
    }

    [Fact]
    public void Lag_scores_equal_double_loops_over_calendar_distances()
    {
        var pairs = 0;
        for (var h = 1; h <= Lags; h++)
        {
            var lag = h;
            var score = battery.Lags[h - 1];
            Assert.Equal(Pairs((t, s) => Earlier(t, s) && Gap(t, s) == lag), score.Pairs);
            pairs += score.Pairs;
            if (score.Pairs > 0) Same(brute.Moment((t, s, j, k) => j == k && Earlier(t, s) && Gap(t, s) == lag ? 1 : 0), score);
        }

        Assert.True(pairs > 20, "the panel has too few pairs to test with");
    }

    [Fact]
    public void Scores_by_alternative_and_by_nest_equal_double_loops()
    {
        for (var a = 0; a < 5; a++)
        {
            var only = a;
            Same(brute.Moment((t, s, j, k) => j == only && k == only && Earlier(t, s) ? 1 : 0), battery.Alternatives[a]);
        }

        for (var m = 0; m < 2; m++)
        {
            var nest = m;
            Same(brute.Moment((t, s, j, k) => NestOf[j] == nest && NestOf[k] == nest && Earlier(t, s) ? 1 : 0), battery.Nests[m]);
        }
    }

    [Fact]
    public void Last_prediction_equals_a_double_loop_and_has_no_bias()
    {
        var z = Enumerable.Range(0, design.Situations).Select(t =>
        {
            var back = Enumerable.Range(0, t).Where(s => Earlier(t, s) && Gap(t, s) == 1).ToList();
            return back.Count == 0 ? new double[5] : brute.P[back.Single()];
        }).ToList();
        Same(brute.Moment(z, [.. z.Select(_ => Matrix<double>.Build.Dense(5, theta.Length))]), battery.LastPrediction);
        Assert.Equal(0, battery.LastPrediction.Bias);
    }

    [Fact]
    public void Information_trace_equals_a_double_loop_and_gives_the_variance_inflation()
    {
        Same(brute.InformationTrace(), battery.InformationTrace);

        // tr(A^-1 sum over persons of s_n s_n') / K, less what each situation alone brings, is 2 m / K: an identity in raw sums.
        var k = theta.Length;
        double persons = 0, situations = 0;
        for (var p = 0; p < Persons; p++)
        {
            var sum = Vector<double>.Build.Dense(k);
            for (var t = p * Occasions; t < (p + 1) * Occasions; t++)
            {
                var s = Vector<double>.Build.Dense(brute.ObservedScore(t));
                sum += s;
                situations += s * brute.Inverse * s;
            }

            persons += sum * brute.Inverse * sum;
        }

        Close((persons - situations) / k, 2 * battery.InformationTrace.Raw / k, persons / k);
        Close(1 + (2 * battery.InformationTrace.Value / k), battery.VarianceInflation, 1);
    }

    [Fact]
    public void Date_score_equals_a_double_loop_over_pairs_of_persons_and_its_cumulants_those_of_the_full_matrices()
    {
        var (raw, rawVariance, bias, value, variance, thirdCumulant) = brute.Date();
        Same((raw, rawVariance, bias, value, variance), battery.Date!.Score);
        Close(thirdCumulant, battery.Date.ThirdCumulant, Math.Pow(rawVariance, 1.5));
    }

    [Fact]
    public void Date_demeaned_scores_equal_double_loops()
    {
        var demeaned = ScoreBattery.Compute(design, NestedLogitForm.UtilityScaled, theta, positions, Lags, CompactNumbers.Of(dates), true, 1)!;
        int Same(int date) => dates.Count(d => d == date);
        double Weight(int t, int s, double decay)
        {
            // z_t = sum over own earlier v of decay * (g_v - mean of g over the persons of v's date).
            var sum = Earlier(t, s) ? decay == 0 ? (Gap(t, s) == 2 ? 1 : 0) : 1 : 0.0;
            for (var v = 0; v < t; v++)
                if (Earlier(t, v) && (decay != 0 || Gap(t, v) == 2) && dates[v] == dates[s]) sum -= 1.0 / Same((int)dates[v]);
            return sum;
        }

        MomentTests.Same(brute.Moment((t, s, j, k) => j == k ? Weight(t, s, 1) : 0), demeaned.Decays[^1]);
        MomentTests.Same(brute.Moment((t, s, j, k) => j == k ? Weight(t, s, 0) : 0), demeaned.Lags[1]);
        Assert.Equal(battery.Date, demeaned.Date);
    }

    [Fact]
    public void The_date_score_does_not_depend_on_the_order_of_persons()
    {
        // The same situations handed over person by person in reverse; only the book-keeping of order differs.
        var order = Enumerable.Range(0, Persons).Reverse().SelectMany(p => Enumerable.Range(p * Occasions, Occasions)).ToArray();
        var covariates = made.Covariates;
        var panel = covariates.Panel;
        ImmutableArray<T> Rows<T>(ImmutableArray<T> values, int width) => [.. order.SelectMany(o => values.Skip(o * width).Take(width))];
        var turned = panel with
        {
            Offered = Rows(panel.Offered, 5),
            Chosen = Rows(panel.Chosen, 1),
            Occasion = Rows(panel.Occasion, 1),
        };
        var set = covariates with
        {
            Panel = turned,
            Covariates = [.. covariates.Covariates.Select(c => c.IsConstant ? c : c with { Values = Rows(c.Values, c.Enters.Length) })],
        };
        var other = ChoiceDesignBuilder.Build(set, made.Tree, made.Nests, NestedLogitForm.UtilityScaled);
        var reversed = ScoreBattery.Compute(
            other, NestedLogitForm.UtilityScaled, theta, new OccasionPositions(Rows(at, 1), [.. new int[at.Length]], 1, "step"), Lags, CompactNumbers.Of(Rows(dates, 1)), false, 1)!;
        var (one, turnedAround) = (battery.Date!, reversed.Date!);
        Close(one.Score.Value, turnedAround.Score.Value, Math.Sqrt(one.Score.Variance));
        Close(one.Score.Variance, turnedAround.Score.Variance, one.Score.Variance);
        Close(one.PValue, turnedAround.PValue, one.PValue);
    }

    [Fact]
    public void Information_whitens_to_the_identity_and_equals_enumeration()
    {
        var white = Whitening.Of(ResidualKernel.Create(design, NestedLogitForm.UtilityScaled, theta.AsSpan()), 1)!;
        var k = theta.Length;
        for (var r = 0; r < k; r++)
            for (var c = 0; c < k; c++) Close(brute.Information[r, c], white.Information[(r * k) + c], brute.Information[r, r]);
        var b = Matrix<double>.Build.Dense(k, k, (r, c) => white.Basis[(r * k) + c]);
        var identity = b * brute.Information * b.Transpose();
        for (var r = 0; r < k; r++)
            for (var c = 0; c < k; c++) Close(r == c ? 1 : 0, identity[r, c], 1);
    }

    [Fact]
    public void No_figure_depends_on_the_number_of_threads()
    {
        var two = ScoreBattery.Compute(design, NestedLogitForm.UtilityScaled, theta, positions, Lags, CompactNumbers.Of(dates), false, 2)!;
        Assert.Equal(battery.Decays.AsEnumerable(), two.Decays);
        Assert.Equal(battery.DecayCovariance.AsEnumerable(), two.DecayCovariance);
        Assert.Equal(battery.Lags.AsEnumerable(), two.Lags);
        Assert.Equal(battery.Date, two.Date);
        Assert.Equal(battery.InformationTrace, two.InformationTrace);
    }

    [Fact]
    public void No_figure_of_many_blocks_depends_on_the_number_of_threads()
    {
        var large = SyntheticPanel.Make(
            6, 150, 20, 5, [SyntheticPanel.Nest("first", "A", "B"), SyntheticPanel.Nest("second", "C", "D")], [0.6, 0.75], habit: 0.6);
        var many = large.Design();
        Assert.True(many.Blocks.Length > 8, "too few blocks to divide");
        var days = CompactNumbers.Of(Enumerable.Range(0, many.Situations).Select(t => (long)(t % 20)));
        var steps = new OccasionPositions([.. Enumerable.Range(0, many.Situations).Select(t => (long)(t % 20))], [.. new int[many.Situations]], 1, "step");
        ScoreBattery Compute(int threads) =>
            ScoreBattery.Compute(many, NestedLogitForm.UtilityScaled, [.. large.Truth], steps, Lags, days, true, threads)!;
        var one = Compute(1);
        foreach (var threads in new[] { 2, 3 })
        {
            var several = Compute(threads);
            Assert.Equal(one.Decays.AsEnumerable(), several.Decays);
            Assert.Equal(one.DecayCovariance.AsEnumerable(), several.DecayCovariance);
            Assert.Equal(one.Lags.AsEnumerable(), several.Lags);
            Assert.Equal(one.Alternatives.AsEnumerable(), several.Alternatives);
            Assert.Equal(one.Nests.AsEnumerable(), several.Nests);
            Assert.Equal(one.LastPrediction, several.LastPrediction);
            Assert.Equal(one.InformationTrace, several.InformationTrace);
            Assert.Equal(one.Date, several.Date);
        }
    }

    [Fact]
    public void Under_the_weekly_rule_only_whole_weeks_have_a_distance_but_lasting_taste_takes_every_earlier_occasion()
    {
        var weekday = Enumerable.Range(0, design.Situations).Select(t => t % Occasions % 2).ToImmutableArray();
        ImmutableArray<long> week = [.. Enumerable.Range(0, design.Situations).Select(t => (long)(t % Occasions / 2))];
        var weekly = ScoreBattery.Compute(
            design, NestedLogitForm.UtilityScaled, theta, new OccasionPositions(week, weekday, 2, "week"), 2, null, false, 1)!;
        bool Whole(int t, int s) => Earlier(t, s) && weekday[t] == weekday[s];
        Same(brute.Moment((t, s, j, k) => j == k && Whole(t, s) ? Math.Pow(0.6, week[t] - week[s] - 1) : 0), weekly.Decays[2]);
        Same(brute.Moment((t, s, j, k) => j == k && Whole(t, s) && week[t] - week[s] == 2 ? 1 : 0), weekly.Lags[1]);
        Same(brute.Moment((t, s, j, k) => j == k && Earlier(t, s) ? 1 : 0), weekly.Decays[^1]);
    }

    private BruteForce Brute(ImmutableArray<double> at)
    {
        var rows = new List<BruteForce.Row>();
        var model = new ClosedFormRows(NestOf, [.. at]);
        var covariates = made.Covariates.Covariates;
        for (var t = 0; t < design.Situations; t++)
        {
            var x = new double[5, covariates.Length];
            for (var k = 0; k < covariates.Length; k++)
                for (var e = 0; e < covariates[k].Enters.Length; e++)
                    x[covariates[k].Enters[e], k] = covariates[k].IsConstant ? 1 : covariates[k].Values[(t * covariates[k].Enters.Length) + e];
            var (p, f, scores) = model.Of(new ClosedFormRows.Row([.. made.Panel.Offered.Skip(t * 5).Take(5)], x));
            rows.Add(new BruteForce.Row(t / Occasions, this.at[t], dates[t], made.Panel.Chosen[t], p, f, scores));
        }

        return new BruteForce(rows);
    }

    private static bool Earlier(int t, int s) => s < t && t / Occasions == s / Occasions;

    private long Gap(int t, int s) => at[t] - at[s];

    private int Pairs(Func<int, int, bool> counts)
    {
        var n = 0;
        for (var t = 0; t < design.Situations; t++)
            for (var s = 0; s < t; s++) if (counts(t, s)) n++;
        return n;
    }

    private static void Same((double Raw, double RawVariance, double Bias, double Value, double Variance) brute, CorrectedScore score)
    {
        var scale = Math.Sqrt(brute.RawVariance);
        Close(brute.Raw, score.Raw, scale);
        Close(brute.RawVariance, score.RawVariance, brute.RawVariance);
        Close(brute.Bias, score.Bias, scale);
        Close(brute.Value, score.Value, scale);
        Close(brute.Variance, score.Variance, brute.RawVariance);
    }

    private static void Close(double expected, double actual, double scale) =>
        Assert.InRange(Math.Abs(expected - actual), 0, SameMethod * Math.Max(Math.Abs(scale), Math.Abs(expected)));
}
