using MathNet.Numerics.Distributions;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

public class ParameterFiguresTests
{
    // NIST/SEMATECH e-Handbook of Statistical Methods, sections 1.3.6.7.1 and 1.3.6.7.2, critical values of the normal and of Student's t;
    // printed digits, quoted from memory.
    [Theory]
    [InlineData(1, 0.95, 12.706)]
    [InlineData(2, 0.95, 4.303)]
    [InlineData(5, 0.95, 2.571)]
    [InlineData(10, 0.90, 1.812)]
    [InlineData(10, 0.95, 2.228)]
    [InlineData(10, 0.99, 3.169)]
    [InlineData(30, 0.95, 2.042)]
    [InlineData(60, 0.95, 2.000)]
    [InlineData(100, 0.99, 2.626)]
    [InlineData(null, 0.90, 1.645)]
    [InlineData(null, 0.95, 1.960)]
    [InlineData(null, 0.99, 2.576)]
    public void Critical_values_are_those_of_the_tables(int? degreesOfFreedom, double confidence, double printed)
    {
        var reference = new ReferenceDistribution(degreesOfFreedom);
        var q = reference.Critical(confidence);
        Assert.Equal(printed, q, 3);
        Assert.Equal(1 - confidence, reference.TwoSided(q), 9);
        Assert.Equal(1 - confidence, reference.TwoSided(-q), 9);
    }

    [Fact]
    public void Closed_forms_of_t_with_one_and_two_degrees_of_freedom_hold()
    {
        // t(1): 1 - 2/pi arctan t. t(2): 1 - t / sqrt(2 + t^2).
        foreach (var t in new[] { 0.1, 1, 3, 40, 1e4 })
        {
            Assert.InRange(new ReferenceDistribution(1).TwoSided(t) / (2 / Math.PI * Math.Atan(1 / t)), 1 - 1e-10, 1 + 1e-10);
            var tail = 2 / (Math.Sqrt(2 + (t * t)) * (Math.Sqrt(2 + (t * t)) + t));
            Assert.InRange(new ReferenceDistribution(2).TwoSided(t) / tail, 1 - 1e-10, 1 + 1e-10);
        }

        Assert.Equal(1, new ReferenceDistribution(null).TwoSided(0));
        foreach (var confidence in new[] { 0.01, 0.5, 0.95, 0.9995, 0.999999 })
            Assert.InRange(new ReferenceDistribution(1).Critical(confidence) * Math.Tan(Math.PI * (1 - confidence) / 2), 1 - 1e-9, 1 + 1e-9);
    }

    [Fact]
    public void Coefficients_have_symmetric_intervals_against_normal_or_t_and_p_values_against_zero()
    {
        var result = StandardErrors.Compute(new LinearToy(61, 12, _ => 5).Input(), Settings(JackknifeKind.Refit, 99, 0.9), WorkContext.Quiet);
        var input = new LinearToy(61, 12, _ => 5).Input();
        foreach (var parameter in result.Parameters)
        {
            var estimate = input.Estimates[parameter.Parameter];
            foreach (var kind in new[] { CovarianceKind.Pooled, CovarianceKind.Robust, CovarianceKind.Cluster, CovarianceKind.Jackknife, CovarianceKind.Bootstrap })
            {
                var normal = kind is CovarianceKind.Pooled or CovarianceKind.Robust;
                var figures = parameter.ByKind[kind];
                var se = figures.StandardError!.Value;
                Assert.Equal(Math.Sqrt(result.Covariances[kind].Matrix![parameter.Parameter, parameter.Parameter]), se);
                var q = normal ? Normal.InvCDF(0, 1, 0.95) : StudentT.InvCDF(0, 1, 11, 0.95);
                Assert.Equal(estimate - (q * se), figures.Interval!.Low, 8);
                Assert.Equal(estimate + (q * se), figures.Interval.High, 8);
                var p = 2 * (normal ? Normal.CDF(0, 1, -Math.Abs(estimate / se)) : StudentT.CDF(0, 1, 11, -Math.Abs(estimate / se)));
                Assert.Equal(p, figures.PValue!.Value, 12);
                Assert.Null(figures.Reason);
            }

            Assert.Null(parameter.ByKind[CovarianceKind.OuterProduct].Interval);
            Assert.Null(parameter.ByKind[CovarianceKind.OuterProduct].PValue);
            Assert.NotNull(parameter.ByKind[CovarianceKind.OuterProduct].StandardError);
            Assert.Contains("second cluster", parameter.ByKind[CovarianceKind.TwoWay].Reason, StringComparison.Ordinal);
            var ratio = parameter.ByKind[CovarianceKind.Cluster].StandardError!.Value / parameter.ByKind[CovarianceKind.Pooled].StandardError!.Value;
            Assert.Equal(ratio, parameter.SeRatio!.Value, 12);
            Assert.Equal(60 / (ratio * ratio), parameter.EquivalentOccasions!.Value, 9);
            Assert.Null(parameter.RatioReason);
            Assert.Null(parameter.RatioLabel);
        }
    }

    [Fact]
    public void Dissimilarities_have_intervals_on_the_log_scale_and_p_values_against_the_parent()
    {
        var made = SyntheticPanel.Make(
            62, 120, 6, 5, [SyntheticPanel.Nest("inner", "A", "B"), SyntheticPanel.Nest("outer", "inner", "C")], [0.5, 0.8], attributes: 3);
        var design = made.Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var input = InferenceInput.From(model, refitter);
        var result = StandardErrors.Compute(input, Settings(), WorkContext.Quiet);
        var inner = design.Layout.Nests.Single(n => n.Name == "inner").Parameter;
        var outer = design.Layout.Nests.Single(n => n.Name == "outer").Parameter;
        var (li, lo) = (model.Parameters[inner], model.Parameters[outer]);
        foreach (var (kind, df) in new[] { (CovarianceKind.Pooled, (double?)null), (CovarianceKind.Cluster, 119) })
        {
            var v = result.Covariances[kind].Matrix!;
            var q = df is { } d ? StudentT.InvCDF(0, 1, d, 0.975) : Normal.InvCDF(0, 1, 0.975);
            var ofInner = result.Parameters[inner].ByKind[kind];
            var ofOuter = result.Parameters[outer].ByKind[kind];
            Assert.Equal(Math.Exp(Math.Log(li) - (q * ofInner.StandardError!.Value / li)), ofInner.Interval!.Low, 8);
            Assert.Equal(Math.Exp(Math.Log(li) + (q * ofInner.StandardError!.Value / li)), ofInner.Interval.High, 8);
            Assert.Equal(P(Math.Log(lo) / (ofOuter.StandardError!.Value / lo), df), ofOuter.PValue!.Value, 10);
            var variance = (v[inner, inner] / (li * li)) + (v[outer, outer] / (lo * lo)) - (2 * v[inner, outer] / (li * lo));
            Assert.Equal(P((Math.Log(li) - Math.Log(lo)) / Math.Sqrt(variance), df), ofInner.PValue!.Value, 10);
        }

        static double P(double z, double? df) => 2 * (df is { } d ? StudentT.CDF(0, 1, d, -Math.Abs(z)) : Normal.CDF(0, 1, -Math.Abs(z)));
    }

    [Fact]
    public void Natural_units_at_the_maximum_give_the_delta_method_from_the_logarithm()
    {
        var design = Small(63, 60, 6).Design();
        var (model, _) = NewtonRefitter.Fit(design, design.PlainStart());
        var k = design.Layout.Count;
        var l = k - 1;
        var at = model.Parameters.ToArray();
        // Minus the Hessian in (b, log l) by differences of the log-scale gradient, then the delta method back to l.
        var log = MathNet.Numerics.LinearAlgebra.Matrix<double>.Build.Dense(k, k);
        for (var c = 0; c < k; c++)
        {
            double[] Gradient(double by)
            {
                var x = (double[])at.Clone();
                x[c] = c == l ? x[c] * Math.Exp(by) : x[c] + by;
                var g = model.Likelihood.Evaluate(x, design.PersonWeight.AsSpan(), PanelChoice.Likelihood.Derivatives.Gradient).Gradient.ToArray();
                g[l] *= x[l];
                return g;
            }

            const double H = 1e-3;
            var (a, b, d, e) = (Gradient(H), Gradient(-H), Gradient(2 * H), Gradient(-2 * H));
            for (var r = 0; r < k; r++) log[r, c] = -((8 * (a[r] - b[r])) - (d[r] - e[r])) / (12 * H);
        }

        var delta = log.Inverse();
        for (var i = 0; i < k; i++)
        {
            delta[i, l] *= at[l];
            delta[l, i] *= at[l];
        }

        var input = InferenceInput.From(model, new ScriptedRefitter(_ => throw new InvalidOperationException()));
        var pooled = PooledCovariance.Estimate(input, out _).Matrix!;
        for (var r = 0; r < k; r++)
            for (var c = 0; c < k; c++)
                Assert.InRange(Math.Abs(delta[r, c] - pooled[r, c]), 0, 1e-6 * Math.Sqrt(pooled[r, r] * pooled[c, c]));
    }

    [Fact]
    public void A_variance_of_zero_supports_no_interval_and_no_test()
    {
        var input = new LinearToy(64, 10, _ => 3).Input();
        var result = StandardErrors.Compute(input with { Scores = _ => new ScoreSums([.. new double[9]], [.. new double[30]]) }, Settings(), WorkContext.Quiet);
        var figures = result.Parameters[0].ByKind[CovarianceKind.Cluster];
        Assert.Equal((0, null, null), (figures.StandardError, figures.Interval, figures.PValue));
        Assert.Contains("zero", figures.Reason, StringComparison.Ordinal);
        Assert.Equal(figures.Reason, result.Parameters[0].RatioReason);
        Assert.NotNull(result.Covariances[CovarianceKind.OuterProduct].Refusal);
    }

    [Fact]
    public void The_percentile_interval_takes_the_tenth_of_399_from_either_end()
    {
        var values = Enumerable.Range(1, 399).Select(i => (double)i).ToArray();
        Assert.Equal(new Interval(10, 390), Percentiles.Of(values, 0, 0.95).Interval);
        Assert.Equal(new Interval(20, 380), Percentiles.Of(values, 0, 0.9).Interval);
        Assert.Equal(new Interval(2.5, 97.5), Percentiles.Of(values[..99], 0, 0.95).Interval);
    }

    [Fact]
    public void Failed_replicates_lie_beyond_both_ends()
    {
        var values = Enumerable.Range(1, 395).Select(i => (double)i).ToArray();
        Assert.Equal(new Interval(6, 390), Percentiles.Of(values, 4, 0.95).Interval);
        Assert.Equal(new Interval(1, 390), Percentiles.Of(values[..390], 9, 0.95).Interval);
        Assert.Null(Percentiles.Of(values[..389], 10, 0.95).Interval);
        Assert.Contains("too few", Percentiles.Of(values[..20], 0, 0.95).Reason, StringComparison.Ordinal);
    }
}
