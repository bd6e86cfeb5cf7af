using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Estimation;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Inference;

public class ScoreBootstrapTests
{
    private const double SameMethod = 1e-8;

    private static readonly InferenceSettings Drawn = new("person", 0.95, JackknifeKind.OneStep, 0, 7) { ScoreDraws = 199 };

    private static readonly Lazy<TestedModel> Ten = new(() => TestedModel.Of(31, 10, 14, Drawn, habit: 0.3));

    [Fact]
    public void With_ten_persons_it_is_a_brute_force_enumeration_of_signs()
    {
        var model = Ten.Value;
        var result = model.Run(TestedModel.Test("both", ["attribute 1", "same as last time"], [-0.2, 0])).ScoreBootstrap!;
        var (statistic, p) = BruteForce(model, ("attribute 1", -0.2), ("same as last time", 0));
        Assert.Equal((true, 1024, ScoreWeights.Rademacher), (result.Enumerated, result.Draws, result.Weights));
        Assert.Equal(statistic, result.Statistic!.Value, 1e-6);
        Assert.Equal(p, result.PValue!.Value, 1e-12);
        Assert.Equal(0, result.MonteCarloError);

        var single = model.Run(TestedModel.Test("one", ["same as last time"])).ScoreBootstrap!;
        (statistic, p) = BruteForce(model, ("same as last time", 0));
        Assert.Equal(statistic, single.Statistic!.Value, 1e-6);
        Assert.Equal(p, single.PValue!.Value, 1e-12);
        Assert.InRange(p, 0.001, 0.999);
    }

    [Fact]
    public void The_interval_holds_the_values_that_are_not_rejected()
    {
        foreach (var (model, label) in new[] { (Ten.Value, "same as last time"), (TestedModel.Of(31, 10, 60, Drawn), "water") })
        {
            var made = model.Run(TestedModel.Test("one", [label])).ScoreBootstrap!;
            Assert.True(made.Interval is not null, $"{label}: {made.Reason} {made.IntervalReason}");
            var interval = made.Interval;
            var estimate = model.Model.Parameters[model.ParameterOf(label)];
            Assert.InRange(estimate, interval.Low, interval.High);
            foreach (var end in new[] { interval.Low, interval.High })
            {
                Assert.True(P(end) <= 0.05, $"{label} at {end}: {P(end)}");
                var inside = label == "water" ? Math.Exp(Math.Log(estimate) + (0.97 * Math.Log(end / estimate))) : estimate + (0.97 * (end - estimate));
                Assert.True(P(inside) > 0.05, $"{label} at {inside}: {P(inside)}");
            }

            double P(double value) => model.Run(TestedModel.Test("at", [label], [value])).ScoreBootstrap!.PValue!.Value;
        }
    }

    [Fact]
    public void Draws_have_the_same_bits_for_any_number_of_threads_and_tell_their_error()
    {
        var model = TestedModel.Of(8, 20, 6, Drawn);
        var one = model.Run(TestedModel.Test("one", ["attribute 2"], [0.3])).ScoreBootstrap!;
        var three = model.Run(TestedModel.Test("one", ["attribute 2"], [0.3]), WorkContext.Quiet with { Threads = 3 }).ScoreBootstrap!;
        Assert.Equal(one, three);
        Assert.Equal((false, 199, ScoreWeights.Rademacher), (one.Enumerated, one.Draws, one.Weights));
        Assert.Equal(Math.Sqrt(one.PValue!.Value * (1 - one.PValue.Value) / 199), one.MonteCarloError!.Value, 1e-12);
        Assert.Equal(0, one.PValue.Value * 200 % 1, SameMethod);
    }

    [Theory]
    [InlineData(5, 999, false, ScoreWeights.SixPoint, 999)]
    [InlineData(6, 999, true, ScoreWeights.Rademacher, 64)]
    [InlineData(12, 99, true, ScoreWeights.Rademacher, 4096)]
    [InlineData(13, 999, false, ScoreWeights.Rademacher, 999)]
    [InlineData(13, 9999, true, ScoreWeights.Rademacher, 8192)]
    public void Signs_are_enumerated_where_they_are_few_and_fine_enough(int clusters, int draws, bool enumerated, ScoreWeights weights, int stands)
    {
        var multipliers = new ScoreMultipliers(clusters, draws, 0.95, 7);
        Assert.Equal((enumerated, weights, stands), (multipliers.IsEnumerated, multipliers.Weights, multipliers.Draws));
    }

    [Fact]
    public void Six_points_have_mean_0_and_variance_1()
    {
        var multipliers = new ScoreMultipliers(5, 4000, 0.95, 7);
        var w = new double[5];
        double sum = 0, squares = 0;
        var seen = new HashSet<double>();
        for (var set = 0; set < multipliers.Sets; set++)
        {
            multipliers.Fill(set, w);
            foreach (var x in w)
            {
                sum += x;
                squares += x * x;
                seen.Add(x);
            }
        }

        Assert.Equal(6, seen.Count);
        Assert.Equal(0, sum / 20_000, 0.03);
        Assert.Equal(1, squares / 20_000, 0.02);
    }

    [Fact]
    public void Sampling_weights_enter_and_their_unit_does_not_matter()
    {
        var made = SyntheticPanel.Make(12, 9, 12, 3, [], []);
        double[] weights = [1, 2, 0.5, 1, 3, 1, 1.5, 1, 2];
        SyntheticPanel Weighted(double unit) => made with
        {
            Covariates = made.Covariates with { Panel = made.Panel with { Weight = [.. weights.Select(w => w * unit)] } },
        };
        var test = TestedModel.Test("one", ["attribute 1"], [-0.3]);
        var result = TestedModel.Of(Weighted(1), Drawn).Run(test);
        var other = TestedModel.Of(Weighted(40), Drawn).Run(test);
        var without = TestedModel.Of(made, Drawn).Run(test);
        Assert.Equal(result.ScoreBootstrap!.Statistic!.Value, other.ScoreBootstrap!.Statistic!.Value, 1e-6);
        Assert.Equal(result.ScoreBootstrap.PValue, other.ScoreBootstrap.PValue);
        Assert.NotEqual(result.ScoreBootstrap.Statistic!.Value, without.ScoreBootstrap!.Statistic!.Value, 1e-3);
        Assert.Null(result.LikelihoodRatio.PValue);
        Assert.NotNull(result.LikelihoodRatio.Reason);
        Assert.NotNull(result.Wald[CovarianceKind.Pooled].Reason);
        Assert.NotNull(result.Wald[CovarianceKind.Cluster].PValue);
    }

    [Fact]
    public void A_true_claim_is_rejected_about_as_often_as_the_level_says()
    {
        const int Panels = 120;
        var rejected = 0;
        var sum = 0.0;
        var settings = Drawn with { ScoreDraws = 99, Jackknife = JackknifeKind.Off };
        for (var i = 0; i < Panels; i++)
        {
            var model = TestedModel.Of(SyntheticPanel.Make(1000 + i, 9, 12, 3, [], []), settings);
            // Two restrictions: no interval, one estimation each.
            var p = model.Run(TestedModel.Test("truth", ["attribute 1", "attribute 2"], [-0.5, 0.5])).ScoreBootstrap!.PValue!.Value;
            sum += p;
            if (p <= 0.05) rejected++;
        }

        // 6 expected; a size of 5 percent gives more than 14 with a probability below 0.2 percent. The mean of p is 0.5 with a standard error of 0.026.
        Assert.InRange(rejected, 1, 14);
        Assert.InRange(sum / Panels, 0.42, 0.58);
    }

    /// <summary>Restricted fit with fixed coefficients, scores row by row, every set of signs, plain sums.</summary>
    private static (double Statistic, double P) BruteForce(TestedModel model, params (string Label, double Value)[] claims)
    {
        var made = model.Made;
        foreach (var (label, value) in claims)
            made = Fits.Change(made, made.Covariates.Covariates.ToList().FindIndex(c => c.Label == label), c => c with { Fixed = value });
        var fit = Fits.Fit(made);
        var design = fit.Design;
        var k = fit.Layout.Count;
        var free = model.Input.Free;
        double Slope(int p, IReadOnlyList<double> at) => p >= fit.Layout.Coefficients ? at[p] : 1;
        var at = fit.Likelihood.Evaluate(fit.Parameters.AsSpan(), design.PersonWeight.AsSpan(), Derivatives.Hessian);
        var h = MathNet.Numerics.LinearAlgebra.Matrix<double>.Build.Dense(k, k, (r, c) =>
            -(at.Hessian[(r * k) + c] * Slope(r, fit.Parameters) * Slope(c, fit.Parameters))
            - (r == c && r >= fit.Layout.Coefficients ? at.Gradient[r] * fit.Parameters[r] : 0));
        var inverse = h.Inverse();
        var scores = fit.Likelihood.Scores(fit.Parameters.AsSpan());
        var q = claims.Length;
        var a = new double[design.Persons][];
        for (var g = 0; g < a.Length; g++)
        {
            a[g] = new double[q];
            for (var i = 0; i < q; i++)
            {
                var tested = model.ParameterOf(claims[i].Label);
                for (var s = design.PersonStart[g]; s < design.PersonStart[g + 1]; s++)
                    for (var c = 0; c < k; c++) a[g][i] += inverse[tested, c] * scores[(s * k) + c] * Slope(c, fit.Parameters);
            }
        }

        double T(int signs)
        {
            var v = MathNet.Numerics.LinearAlgebra.Vector<double>.Build.Dense(q);
            var m = MathNet.Numerics.LinearAlgebra.Matrix<double>.Build.Dense(q, q);
            for (var g = 0; g < a.Length; g++)
            {
                var row = MathNet.Numerics.LinearAlgebra.Vector<double>.Build.Dense(a[g]) * (((signs >> g) & 1) == 0 ? 1 : -1);
                v += row;
                m += row.OuterProduct(row);
            }

            return v.DotProduct(m.Solve(v));
        }

        var own = T(0);
        Assert.Equal(10, a.Length);
        return (own, Enumerable.Range(0, 1024).Count(s => T(s) >= own - 1e-9) / 1024.0);
    }
}
