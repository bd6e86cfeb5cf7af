using PanelChoice.Estimation;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

public class UnidentifiedTests
{
    private static readonly SyntheticPanel Made = SyntheticPanel.Make(31, 40, 6, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.6]);

    [Fact]
    public void A_term_that_is_the_same_for_all_alternatives_is_named_and_held_at_zero()
    {
        var fit = Fits.Fit(Fits.Add(Made, Fits.Shared(Made, "rain", (o, _) => o % 3)));
        Assert.Equal(FitStatus.NotIdentified, fit.Status);
        var finding = Assert.Single(fit.Findings, f => f.Id == "fit.no_variation");
        Assert.Contains("'rain'", finding.Sentence, StringComparison.Ordinal);
        Assert.Equal(Place(fit, "rain"), Assert.Single(finding.Parameters));
        Assert.Equal(Place(fit, "rain"), Assert.Single(fit.Held));
        Assert.Equal(0, fit.Parameters[Place(fit, "rain")]);
        AssertRestIsTheFitWithout(fit, "rain");
    }

    [Fact]
    public void A_combination_of_other_terms_is_named_with_them_and_the_rest_is_estimated()
    {
        var (first, second) = (Made.Covariates.Covariates[3].Values, Made.Covariates.Covariates[4].Values);
        var fit = Fits.Fit(Fits.Add(Made, Fits.Shared(Made, "mixture", (o, j) => (2e3 * first[(o * 4) + j]) - (700 * second[(o * 4) + j]) + (o % 5))));
        Assert.Equal(FitStatus.NotIdentified, fit.Status);
        var finding = Assert.Single(fit.Findings, f => f.Id == "fit.collinear");
        Assert.Equal(["mixture", "attribute 1", "attribute 2"], finding.Parameters.Select(k => fit.Layout.Parameters[k].Name));
        Assert.Contains("'attribute 1' and 'attribute 2'", finding.Sentence, StringComparison.Ordinal);
        AssertRestIsTheFitWithout(fit, "mixture");
    }

    [Fact]
    public void A_term_that_repeats_a_sum_of_constants_is_collinear_with_them()
    {
        var fit = Fits.Fit(Fits.Add(Made, Fits.Shared(Made, "covered", (_, j) => j is 1 or 2 ? 1 : 0)));
        var finding = Assert.Single(fit.Findings, f => f.Id == "fit.collinear");
        Assert.Equal(["covered", "constant [B]", "constant [C]"], finding.Parameters.Select(k => fit.Layout.Parameters[k].Label));
    }

    [Fact]
    public void Two_separate_dependencies_are_two_findings()
    {
        var (first, second) = (Made.Covariates.Covariates[3].Values, Made.Covariates.Covariates[4].Values);
        var more = Fits.Add(Made, Fits.Shared(Made, "first again", (o, j) => -first[(o * 4) + j]));
        var fit = Fits.Fit(Fits.Add(more, Fits.Shared(more, "second again", (o, j) => 3 * second[(o * 4) + j])));
        Assert.Equal(["first again", "second again"], fit.Held.Select(k => fit.Layout.Parameters[k].Name));
        Assert.Equal(2, fit.Findings.Count(f => f.Id == "fit.collinear"));
    }

    [Theory]
    [InlineData(1e-4, FitStatus.Converged)]
    [InlineData(1e-8, FitStatus.NotIdentified)]
    public void A_nearly_repeated_term_is_estimated_with_a_warning_and_one_repeated_to_rounding_is_not(double difference, FitStatus expected)
    {
        var first = Made.Covariates.Covariates[3].Values;
        var random = new CounterRandom(1, "near copy", 0);
        var noise = Enumerable.Range(0, first.Length).Select(_ => random.NextDouble() - 0.5).ToArray();
        var fit = Fits.Fit(Fits.Add(Made, Fits.Shared(Made, "near copy", (o, j) => first[(o * 4) + j] + (difference * noise[(o * 4) + j]))));
        Assert.Equal(expected, fit.Status);
        var finding = Assert.Single(fit.Findings, f => f.Id == (expected == FitStatus.Converged ? "fit.weakly_identified" : "fit.collinear"));
        Assert.Contains(Place(fit, "attribute 1"), finding.Parameters);
        Assert.Contains(Place(fit, "near copy"), finding.Parameters);
    }

    [Fact]
    public void A_dissimilarity_that_only_constants_could_tell_is_not_identified()
    {
        // Three shares for three constants and a dissimilarity.
        var made = SyntheticPanel.Make(32, 40, 6, 4, [SyntheticPanel.Nest("pair", "C", "D")], [0.6], attributes: 0, offeredShare: 1);
        var fit = Fits.Fit(made, starts: 5);
        Assert.Equal(FitStatus.NotIdentified, fit.Status);
        var finding = Assert.Single(fit.Findings, f => f.Id == "fit.not_identified");
        Assert.Contains(Place(fit, "pair"), finding.Parameters);
        Assert.Contains("'dissimilarity of pair'", finding.Sentence, StringComparison.Ordinal);
        Assert.Equal(fit.LogLikelihoodConstants!.Value, fit.LogLikelihood, 8);
    }

    [Fact]
    public void In_the_unscaled_form_a_shift_common_to_all_alternatives_is_told_by_unequal_dissimilarities()
    {
        var made = SyntheticPanel.Make(33, 100, 5, 4, [SyntheticPanel.Nest("pair", "A", "B"), SyntheticPanel.Nest("other", "C", "D")], [0.3, 0.9]);
        made = Fits.Add(made, Fits.Shared(made, "rain", (o, _) => o % 3));
        Assert.Empty(Fits.Fit(made, form: NestedLogitForm.Unscaled).Held);
        Assert.Single(Fits.Fit(made).Held);
    }

    [Fact]
    public void In_the_unscaled_form_two_nests_around_the_same_alternatives_have_one_product_of_dissimilarities_to_tell()
    {
        var made = SyntheticPanel.Make(34, 60, 6, 4, [SyntheticPanel.Nest("outer", "inner"), SyntheticPanel.Nest("inner", "A", "B")], [0.9, 0.7]);
        foreach (var starts in new[] { 1, 3, 8 })
        {
            var fit = Fits.Fit(made, starts, NestedLogitForm.Unscaled);
            Assert.Equal(FitStatus.NotIdentified, fit.Status);
            var finding = Assert.Single(fit.Findings, f => f.Id == "fit.not_identified");
            Assert.Equal(["outer", "inner"], finding.Parameters.Select(k => fit.Layout.Parameters[k].Name));
        }
    }

    private static int Place(FittedModel fit, string name) =>
        Enumerable.Range(0, fit.Layout.Count).Single(k => fit.Layout.Parameters[k].Name == name);

    private static void AssertRestIsTheFitWithout(FittedModel fit, string term)
    {
        var without = Fits.Fit(Made);
        var k = 0;
        foreach (var expected in without.Parameters)
        {
            if (fit.Layout.Parameters[k].Name == term) k++;
            Assert.InRange(Math.Abs(fit.Parameters[k++] - expected), 0, 1e-8);
        }
    }
}
