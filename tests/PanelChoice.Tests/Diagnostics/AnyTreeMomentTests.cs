using System.Collections.Immutable;
using PanelChoice.Diagnostics;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Likelihood;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Diagnostics;

/// <summary>
/// The whole battery by either kernel on random trees up to four nodes deep (shared, fixed and one-alternative nests, weights, missing alternatives, gaps)
/// against double loops over choices enumerated one by one.
/// </summary>
public class AnyTreeMomentTests
{
    /// <summary>Two ways to the same sums, relative to the standard deviation (moments, biases) or the variance (variances).</summary>
    private const double SameMethod = 1e-10;
    private const int Lags = 3;

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Every_moment_equals_double_loops(string kernel, NestedLogitForm form)
    {
        var tested = 0;
        for (var seed = 1; seed <= 14; seed++)
        {
            var made = RandomTreeCase.Make(seed, 9, 3);
            var design = made.Design(form);
            var random = new CounterRandom(seed, "gaps", 0);
            var at = new long[design.Situations];
            for (var t = 1; t < at.Length; t++) at[t] = design.PersonStart.Contains(t) ? random.Next(3) : at[t - 1] + 1 + (random.Next(3) == 0 ? random.Next(3) : 0);
            var positions = new OccasionPositions([.. at], [.. new int[at.Length]], 1, "step");
            var battery = ScoreBattery.Compute(
                ResidualKernel.Create(design, form, made.Point, kernel), positions, Lags, CompactNumbers.Of(at), false, 1);
            // A few random designs of so few situations do not identify every parameter; then both ways have nothing to say.
            if (battery is null) continue;
            tested++;
            var brute = new BruteForce([.. new EnumeratedSituations(design, form, made.Point) { At = [.. at] }]);
            bool Earlier(int t, int s) => s < t && brute.Rows[s].Person == brute.Rows[t].Person;

            for (var r = 0; r < PersonHistory.Decays.Length; r++)
            {
                var rho = PersonHistory.Decays[r];
                Same(brute.Moment((t, s, j, k) => j == k && Earlier(t, s) ? Math.Pow(rho, at[t] - at[s] - 1) : 0), battery.Decays[r]);
            }

            for (var h = 1; h <= Lags; h++) Same(brute.Moment((t, s, j, k) => j == k && Earlier(t, s) && at[t] - at[s] == h ? 1 : 0), battery.Lags[h - 1]);
            for (var a = 0; a < brute.J; a++) Same(brute.Moment((t, s, j, k) => j == a && k == a && Earlier(t, s) ? 1 : 0), battery.Alternatives[a]);
            for (var m = 0; m < battery.Nests.Length; m++)
            {
                var under = design.Tree.AlternativesUnder(design.Layout.Nests[m].Node).ToHashSet();
                Same(brute.Moment((t, s, j, k) => under.Contains(j) && under.Contains(k) && Earlier(t, s) ? 1 : 0), battery.Nests[m]);
            }

            Same(brute.InformationTrace(), battery.InformationTrace);
            var (raw, rawVariance, bias, value, variance, thirdCumulant) = brute.Date();
            Same((raw, rawVariance, bias, value, variance), battery.Date!.Score);
            Close(thirdCumulant, battery.Date.ThirdCumulant, Math.Pow(rawVariance, 1.5));
        }

        Assert.True(tested >= 8, $"only {tested} cases could be tested");
    }

    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled, false)]
    [InlineData(NestedLogitForm.Unscaled, true)]
    public void The_kernels_agree_on_panels_of_many_blocks_and_of_a_person_longer_than_a_strip(NestedLogitForm form, bool isDemeaned)
    {
        for (var seed = 1; seed <= 3; seed++)
        {
            // The last person has 400 occasions: more than the lanes of any strip.
            var made = RandomTreeCase.Make(seed, 40, 100);
            var design = made.Design(form);
            var at = Enumerable.Range(0, design.Situations).Select(t => (long)(t - design.PersonStart[design.PersonOf[t]])).ToImmutableArray();
            var positions = new OccasionPositions(at, [.. at.Select(d => (int)(d % 2))], 2, "week");
            ScoreBattery Compute(string kernel, int threads) => ScoreBattery.Compute(
                ResidualKernel.Create(design, form, made.Point, kernel), positions, Lags, CompactNumbers.Of(at), isDemeaned, threads)!;
            var (scalar, vector) = (Compute("scalar", 1), Compute("vector", 2));
            foreach (var (expected, actual) in All(scalar).Zip(All(vector)))
            {
                var scale = Math.Sqrt(expected.RawVariance);
                Close(expected.Raw, actual.Raw, scale);
                Close(expected.RawVariance, actual.RawVariance, expected.RawVariance);
                Close(expected.Bias, actual.Bias, scale);
                Close(expected.Value, actual.Value, scale);
                Close(expected.Variance, actual.Variance, expected.RawVariance);
                Assert.Equal(expected.Pairs, actual.Pairs);
            }
        }

        static IEnumerable<CorrectedScore> All(ScoreBattery battery) =>
            [.. battery.Decays, .. battery.Lags, .. battery.Alternatives, .. battery.Nests, battery.LastPrediction, battery.InformationTrace, battery.Date!.Score];
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
