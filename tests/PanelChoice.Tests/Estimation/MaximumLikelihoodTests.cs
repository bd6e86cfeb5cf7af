using MathNet.Numerics.LinearAlgebra.Double;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

public class MaximumLikelihoodTests
{
    private const double SameMethod = 1e-8;

    [Fact]
    public void Plain_logit_recovers_the_truth()
    {
        var made = SyntheticPanel.Make(1, 80, 10, 4, [], [], habit: 0.6);
        var fit = Fits.Fit(made);
        Assert.Equal(FitStatus.Converged, fit.Status);
        AssertWithinFourErrors(fit, made.Truth);
        Assert.Equal(1, fit.StartsConverged);
        Assert.Single(fit.Optima);
        Assert.Empty(fit.Findings);
    }

    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled)]
    [InlineData(NestedLogitForm.Unscaled)]
    public void Nested_logit_recovers_the_truth(NestedLogitForm form)
    {
        // One nest level holding every alternative with a common dissimilarity: there the two forms are the same model up to a factor l.
        var made = SyntheticPanel.Make(
            2, 150, 10, 4, [SyntheticPanel.Nest("first", "A", "B"), SyntheticPanel.Nest("second", "C", "D") with { SameAs = "first" }], [0.5], offeredShare: 1);
        var fit = Fits.Fit(made, form: form);
        var truth = (double[])made.Truth.Clone();
        if (form == NestedLogitForm.Unscaled)
            for (var k = 0; k < truth.Length - 1; k++) truth[k] /= 0.5;
        Assert.Equal(FitStatus.Converged, fit.Status);
        AssertWithinFourErrors(fit, truth);
        Assert.True(fit.GradientNorm < 1e-9, $"{fit.GradientNorm}");
        Assert.True(fit.LogLikelihood > fit.LogLikelihoodConstants && fit.LogLikelihoodConstants > fit.LogLikelihoodEqualProbability);
    }

    [Fact]
    public void A_three_level_tree_recovers_the_truth()
    {
        var made = SyntheticPanel.Make(
            3, 250, 10, 5, [SyntheticPanel.Nest("inner", "A", "B"), SyntheticPanel.Nest("outer", "inner", "C")], [0.4, 0.7]);
        var fit = Fits.Fit(made, starts: 6);
        Assert.Equal(FitStatus.Converged, fit.Status);
        AssertWithinFourErrors(fit, made.Truth);
        Assert.True(fit.StartsConverged >= 5);
    }

    [Fact]
    public void The_unit_of_a_column_does_not_matter()
    {
        var made = SyntheticPanel.Make(4, 40, 8, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.6]);
        var plain = Fits.Fit(made, starts: 4);
        var scaled = Fits.Fit(Fits.Change(made, 3, c => c with { Values = [.. c.Values.Select(v => v * 1e6)] }), starts: 4);
        for (var k = 0; k < plain.Parameters.Length; k++)
            AssertRelative(plain.Parameters[k], scaled.Parameters[k] * (k == 3 ? 1e6 : 1), SameMethod);
        AssertRelative(plain.LogLikelihood, scaled.LogLikelihood, 1e-12);
    }

    [Fact]
    public void The_order_of_persons_does_not_matter()
    {
        var made = SyntheticPanel.Make(5, 30, 6, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.6], habit: 0.5);
        var design = made.Design();
        var forward = Fits.Fit(design, NestedLogitForm.UtilityScaled, 3);
        var backward = Fits.Fit(Fits.Persons(made, [.. Enumerable.Range(0, 30).Reverse()]), NestedLogitForm.UtilityScaled, 3);
        for (var k = 0; k < design.Layout.Count; k++) AssertRelative(forward.Parameters[k], backward.Parameters[k], SameMethod);
    }

    [Fact]
    public void Weights_count_as_repeated_persons_and_their_unit_does_not_matter()
    {
        var made = SyntheticPanel.Make(6, 24, 6, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.6]);
        var weight = Enumerable.Range(0, 24).Select(p => 1.0 + (p % 3)).ToArray();
        var copies = Enumerable.Range(0, 24).SelectMany(p => Enumerable.Repeat(p, (int)weight[p])).ToArray();
        var weighted = Fits.Fit(made.Design() with { PersonWeight = [.. weight] }, NestedLogitForm.UtilityScaled, 3);
        var tripled = Fits.Fit(made.Design() with { PersonWeight = [.. weight.Select(w => 3e4 * w)] }, NestedLogitForm.UtilityScaled, 3);
        var repeated = Fits.Fit(Fits.Persons(made, copies), NestedLogitForm.UtilityScaled, 3);
        for (var k = 0; k < made.Truth.Length; k++)
        {
            AssertRelative(repeated.Parameters[k], weighted.Parameters[k], SameMethod);
            AssertRelative(weighted.Parameters[k], tripled.Parameters[k], SameMethod);
        }

        AssertRelative(repeated.LogLikelihood, weighted.LogLikelihood, 1e-12);
        AssertRelative(repeated.LogLikelihoodConstants!.Value, weighted.LogLikelihoodConstants!.Value, 1e-12);
        Assert.True(weighted.GradientNorm < 1e-9);
    }

    [Fact]
    public void Fixed_values_are_kept_and_the_rest_is_the_maximum_given_them()
    {
        var made = SyntheticPanel.Make(7, 40, 8, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.6]);
        var held = Fits.Change(made, 3, c => c with { Fixed = -0.25 }) with { Nests = [SyntheticPanel.Nest("pair", "A", "B") with { Dissimilarity = 0.8 }] };
        held = held with { Tree = SyntheticPanel.TreeOf(made.Tree.Alternatives, held.Nests) };
        var fit = Fits.Fit(held);
        Assert.Equal(FitStatus.Converged, fit.Status);
        Assert.Equal(-0.25, fit.Parameters[3]);
        Assert.Equal(0.8, fit.Parameters[5]);
        var gradient = fit.Likelihood.Evaluate(fit.Parameters.AsSpan(), fit.Design.PersonWeight.AsSpan(), Derivatives.Gradient).Gradient;
        foreach (var k in fit.Layout.Free) Assert.InRange(Math.Abs(gradient[k]), 0, 1e-8);
        Assert.True(Math.Abs(gradient[3]) > 0.1 && Math.Abs(gradient[5]) > 0.01);
    }

    [Fact]
    public void Starting_values_are_used_and_do_not_change_a_concave_estimate()
    {
        var made = SyntheticPanel.Make(8, 40, 8, 4, [], []);
        var plain = Fits.Fit(made);
        var at = plain.Parameters;
        var started = Fits.Fit(made with
        {
            Covariates = made.Covariates with { Covariates = [.. made.Covariates.Covariates.Select((c, k) => c with { Start = at[k] })] },
        });
        Assert.True(started.Iterations <= 1 && plain.Iterations > 2);
        for (var k = 0; k < at.Length; k++) AssertRelative(at[k], started.Parameters[k], SameMethod);
    }

    [Fact]
    public void Nests_that_share_a_dissimilarity_have_one_parameter()
    {
        var made = SyntheticPanel.Make(
            9, 120, 10, 4, [SyntheticPanel.Nest("one", "A", "B"), SyntheticPanel.Nest("two", "C", "D") with { SameAs = "one" }], [0.55]);
        var fit = Fits.Fit(made, starts: 4);
        Assert.Equal(FitStatus.Converged, fit.Status);
        Assert.Single(fit.Layout.Free, k => k >= fit.Layout.Coefficients);
        AssertWithinFourErrors(fit, made.Truth);
    }

    [Fact]
    public void Equal_bits_for_any_number_of_threads()
    {
        var made = SyntheticPanel.Make(10, 90, 6, 4, [SyntheticPanel.Nest("pair", "A", "B"), SyntheticPanel.Nest("other", "C", "D")], [0.6, 0.4]);
        var design = made.Design();
        var settings = new EstimateSettings(NestedLogitForm.UtilityScaled, 5, 7);
        FittedModel With(int threads) => MaximumLikelihood.Fit(
            LikelihoodKernel.Create(design, settings.Form, threads), settings.Form, settings, new WorkContext(threads, null, CancellationToken.None));
        var (one, two) = (With(1), With(2));
        Assert.Equal(one.Parameters.ToArray(), two.Parameters.ToArray());
        Assert.Equal(one.Hessian.ToArray(), two.Hessian.ToArray());
        Assert.Equal(one.LogLikelihood, two.LogLikelihood);
        Assert.Equal(one.Optima.Select(o => (o.LogLikelihood, o.Starts)), two.Optima.Select(o => (o.LogLikelihood, o.Starts)));
    }

    [Fact]
    public void Progress_is_reported_and_cancellation_obeyed()
    {
        var made = SyntheticPanel.Make(10, 20, 5, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.6]);
        var seen = new List<WorkProgress>();
        var settings = new EstimateSettings(NestedLogitForm.UtilityScaled, 4, 7);
        var likelihood = LikelihoodKernel.Create(made.Design(), settings.Form, 1);
        MaximumLikelihood.Fit(likelihood, settings.Form, settings, new WorkContext(1, new Recorder(seen), CancellationToken.None));
        Assert.Contains(new WorkProgress("starts", 4, 4), seen);
        Assert.Throws<OperationCanceledException>(() =>
            MaximumLikelihood.Fit(likelihood, settings.Form, settings, new WorkContext(1, null, new CancellationToken(true))));
    }

    [Fact]
    public void A_dissimilarity_above_one_is_estimated_and_reported()
    {
        var made = SyntheticPanel.Make(12, 150, 10, 4, [SyntheticPanel.Nest("pair", "A", "B")], [1.6]);
        var fit = Fits.Fit(made, starts: 4);
        Assert.Equal(FitStatus.Converged, fit.Status);
        Assert.True(fit.Parameters[^1] > 1.2);
        var finding = Assert.Single(fit.Findings, f => f.Id == "fit.outside_range");
        Assert.Contains("'pair'", finding.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_nest_that_is_never_two_wide_is_said_so()
    {
        var made = SyntheticPanel.Make(13, 30, 6, 4, [SyntheticPanel.Nest("alone", "A"), SyntheticPanel.Nest("pair", "B", "C")], [1, 0.6]);
        var fit = Fits.Fit(made, starts: 3);
        Assert.Equal(FitStatus.Converged, fit.Status);
        Assert.Contains("'alone'", Assert.Single(fit.Findings, f => f.Id == "fit.never_wider").Sentence, StringComparison.Ordinal);
    }

    private static void AssertWithinFourErrors(FittedModel fit, double[] truth)
    {
        var free = fit.Layout.Free;
        var K = fit.Layout.Count;
        var information = DenseMatrix.Create(free.Length, free.Length, (r, c) => -fit.Hessian[(free[r] * K) + free[c]]);
        var covariance = information.Inverse();
        for (var i = 0; i < free.Length; i++)
        {
            var error = Math.Sqrt(covariance[i, i]);
            Assert.InRange(Math.Abs(fit.Parameters[free[i]] - truth[free[i]]), 0, 4 * error);
        }
    }

    private static void AssertRelative(double expected, double actual, double tolerance) =>
        Assert.InRange(Math.Abs(actual - expected), 0, tolerance * Math.Max(1e-3, Math.Abs(expected)));

    private sealed class Recorder(List<WorkProgress> into) : IProgress<WorkProgress>
    {
        public void Report(WorkProgress value) => into.Add(value);
    }
}
