using PanelChoice.Estimation;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

public class BoundaryTests
{
    [Fact]
    public void A_nest_whose_members_are_told_apart_with_certainty_runs_to_zero()
    {
        // Inside the pair the better of the two is always taken, while the choice of the pair itself is noisy.
        var made = SyntheticPanel.Make(51, 60, 6, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.6], offeredShare: 1);
        var (x, y) = (made.Covariates.Covariates[3].Values, made.Covariates.Covariates[4].Values);
        double Utility(int o, int j) => (j == 1 ? 0.25 : 0) - (0.5 * x[(o * 4) + j]) + (0.5 * y[(o * 4) + j]);
        var chosen = made.Panel.Chosen.Select((j, o) => j > 1 ? j : Utility(o, 0) > Utility(o, 1) ? 0 : 1);
        var fit = Fits.Fit(made with { Covariates = made.Covariates with { Panel = made.Panel with { Chosen = [.. chosen] } } }, starts: 6);
        Assert.Equal(FitStatus.Boundary, fit.Status);
        var finding = Assert.Single(fit.Findings, f => f.Id == "fit.boundary");
        Assert.Contains("'pair' runs to 0", finding.Sentence, StringComparison.Ordinal);
        Assert.Contains("no interior maximum", finding.Sentence, StringComparison.Ordinal);
        Assert.Equal(5, Assert.Single(finding.Parameters));
        Assert.True(fit.Parameters[5] < 0.01);
    }

    [Fact]
    public void In_the_unscaled_form_a_nest_that_repels_by_its_own_merits_runs_to_zero()
    {
        // The pair is left exactly when its members improve: the value of the nest enters with the wrong sign.
        var made = SyntheticPanel.Make(52, 80, 6, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.9], offeredShare: 1);
        var (x, y) = (made.Covariates.Covariates[3].Values, made.Covariates.Covariates[4].Values);
        double Merit(int o, int j) => (0.5 * y[(o * 4) + j]) - (0.5 * x[(o * 4) + j]);
        var random = new CounterRandom(2, "repelled", 0);
        var chosen = made.Panel.Chosen.Select((_, o) =>
        {
            var inPair = random.NextDouble() < 1 / (1 + Math.Exp(2 * Math.Max(Merit(o, 0), Merit(o, 1))));
            var (a, b) = inPair ? (0, 1) : (2, 3);
            return random.NextDouble() < 1 / (1 + Math.Exp(Merit(o, b) - Merit(o, a))) ? a : b;
        }).ToArray();
        var fit = Fits.Fit(
            made with { Covariates = made.Covariates with { Panel = made.Panel with { Chosen = [.. chosen] } } }, starts: 6, form: NestedLogitForm.Unscaled);
        Assert.Equal(FitStatus.Boundary, fit.Status);
        Assert.Contains("'pair' runs to 0", Assert.Single(fit.Findings, f => f.Id == "fit.boundary").Sentence, StringComparison.Ordinal);
    }

    [Fact]
    public void A_nest_whose_members_are_chosen_against_their_utilities_grows_without_end()
    {
        var made = SyntheticPanel.Make(53, 80, 6, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.9], offeredShare: 1);
        var swapped = made.Panel.Chosen.Select(j => j < 2 ? 1 - j : j);
        var fit = Fits.Fit(made with { Covariates = made.Covariates with { Panel = made.Panel with { Chosen = [.. swapped] } } }, starts: 4);
        Assert.Equal(FitStatus.Boundary, fit.Status);
        Assert.Contains("'pair' grows without end", Assert.Single(fit.Findings, f => f.Id == "fit.boundary").Sentence, StringComparison.Ordinal);
    }
}
