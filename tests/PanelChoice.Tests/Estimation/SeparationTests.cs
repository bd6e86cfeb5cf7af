using PanelChoice.Estimation;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

public class SeparationTests
{
    private static readonly SyntheticPanel Made = SyntheticPanel.Make(41, 40, 6, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.6], offeredShare: 1);

    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled)]
    [InlineData(NestedLogitForm.Unscaled)]
    public void An_alternative_that_nobody_chooses_separates_by_its_constant(NestedLogitForm form)
    {
        var made = Made with
        {
            Covariates = Made.Covariates with { Panel = Made.Panel with { Chosen = [.. Made.Panel.Chosen.Select((j, o) => j == 3 ? o % 3 : j)] } },
        };
        var fit = Fits.Fit(made, form: form);
        Assert.Equal(FitStatus.Separated, fit.Status);
        var finding = Assert.Single(fit.Findings, f => f.Id == "fit.separated");
        Assert.Equal("constant [D]", fit.Layout.Parameters[Assert.Single(finding.Parameters)].Label);
        Assert.Contains("'D' is never chosen", finding.Sentence, StringComparison.Ordinal);
        Assert.Contains("falls", finding.Sentence, StringComparison.Ordinal);
        Assert.True(fit.Parameters[2] < -5);
        Assert.Null(fit.LogLikelihoodConstants);
        Assert.Empty(fit.Optima);

        // The other terms end where they would without the alternative.
        var rest = fit.Likelihood.Evaluate(
            fit.Parameters.AsSpan(), fit.Design.PersonWeight.AsSpan(), PanelChoice.Likelihood.Derivatives.Gradient).Gradient;
        foreach (var k in fit.Layout.Free.Where(k => k != 2)) Assert.InRange(Math.Abs(rest[k]), 0, 1e-6);
    }

    [Theory]
    [InlineData(1, "rises")]
    [InlineData(-20, "falls")]
    public void A_term_that_tells_every_choice_separates(double sign, string way)
    {
        var fit = Fits.Fit(Fits.Add(Made, Fits.Shared(Made, "oracle", (o, j) => Made.Panel.Chosen[o] == j ? sign : 0)));
        Assert.Equal(FitStatus.Separated, fit.Status);
        var finding = Assert.Single(fit.Findings, f => f.Id == "fit.separated");
        Assert.Contains("'oracle'", finding.Sentence, StringComparison.Ordinal);
        Assert.Contains(way, finding.Sentence, StringComparison.Ordinal);
        Assert.True(fit.Parameters[5] * sign > 0);
    }

    [Fact]
    public void A_term_that_tells_the_choices_of_a_few_situations_separates()
    {
        // Quasi-complete separation: no variation outside one person's record, where it points at the choice.
        var fit = Fits.Fit(Fits.Add(Made, Fits.Shared(Made, "informed", (o, j) => o / 6 == 7 && Made.Panel.Chosen[o] == j ? 1 : 0)));
        Assert.Equal(FitStatus.Separated, fit.Status);
        Assert.Contains("'informed'", Assert.Single(fit.Findings, f => f.Id == "fit.separated").Sentence, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData(1.0)]
    [InlineData(0.2)]
    public void Two_terms_that_separate_only_together_are_named_with_their_direction(double share)
    {
        var random = new CounterRandom(1, "hidden separation", 0);
        var noise = Enumerable.Range(0, 240 * 4).Select(_ => random.NextDouble() - 0.5).ToArray();
        var told = Enumerable.Range(0, 240).Select(_ => random.NextDouble() < share).ToArray();
        var made = Fits.Add(Made, Fits.Shared(Made, "first half", (o, j) => (told[o] && Made.Panel.Chosen[o] == j ? 0.3 : 0) + noise[(o * 4) + j]));
        made = Fits.Add(made, Fits.Shared(made, "second half", (o, j) => 3 * noise[(o * 4) + j]));
        var fit = Fits.Fit(made);
        Assert.Equal(FitStatus.Separated, fit.Status);
        var finding = Assert.Single(fit.Findings, f => f.Id == "fit.separated");
        Assert.Equal(["first half", "second half"], finding.Parameters.Select(k => fit.Layout.Parameters[k].Name));
        Assert.Contains("raising 'first half' and lowering 'second half'", finding.Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void Strong_but_finite_effects_are_not_taken_for_separation()
    {
        // The oracle is wrong in 6 of 240 situations.
        var fit = Fits.Fit(Fits.Add(Made, Fits.Shared(Made, "oracle", (o, j) => (o % 40 == 17 ? Made.Panel.Chosen[o] != j : Made.Panel.Chosen[o] == j) ? 1 : 0)));
        Assert.Equal(FitStatus.Converged, fit.Status);
        Assert.True(fit.Parameters[5] > 3);
    }
}
