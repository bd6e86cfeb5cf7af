using PanelChoice.Diagnostics;
using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Diagnostics;

/// <summary>Scores and expectations by enumeration, on a tree of three levels and in both forms.</summary>
public class SituationScoresTests
{
    private const double Identity = 1e-10;
    private const double Difference = 1e-8;

    private readonly SyntheticPanel made = SyntheticPanel.Make(
        21, 6, 5, 6,
        [SyntheticPanel.Nest("inner", "A", "B"), SyntheticPanel.Nest("outer", "inner", "C"), SyntheticPanel.Nest("other", "D", "E")],
        [0.45, 0.7, 0.6]);

    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled)]
    [InlineData(NestedLogitForm.Unscaled)]
    public void Residuals_and_scores_have_mean_zero_and_in_the_scaled_form_residuals_sum_to_zero(NestedLogitForm form)
    {
        var design = made.Design(form);
        var scores = new SituationScores(design, form, made.Truth, null);
        var g = new double[scores.J];
        var s = new double[scores.K];
        for (var t = 0; t < design.Situations; t++)
        {
            scores.Load(t);
            var meanG = new double[scores.J];
            var meanS = new double[scores.K];
            for (var i = 0; i < scores.J; i++)
            {
                if (scores.Probability[i] == 0) continue;
                scores.Hypothetical(i, g, s);
                if (form == NestedLogitForm.UtilityScaled) Assert.InRange(Math.Abs(g.Sum()), 0, Identity);
                for (var j = 0; j < scores.J; j++) meanG[j] += scores.Probability[i] * g[j];
                for (var k = 0; k < scores.K; k++) meanS[k] += scores.Probability[i] * s[k];
            }

            Assert.Equal(1, scores.Probability.Sum(), Identity);
            Assert.All(meanG, x => Assert.InRange(Math.Abs(x), 0, Identity));
            Assert.All(meanS, x => Assert.InRange(Math.Abs(x), 0, Identity));
        }
    }

    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled)]
    [InlineData(NestedLogitForm.Unscaled)]
    public void Observed_scores_equal_those_of_the_likelihood_and_covariances_equal_enumeration(NestedLogitForm form)
    {
        var design = made.Design(form);
        var likelihood = new ScalarNestedLogit(design, form, 1);
        var expected = likelihood.Scores(made.Truth);
        var scores = new SituationScores(design, form, made.Truth, null);
        var g = new double[scores.J];
        var s = new double[scores.K];
        for (var t = 0; t < design.Situations; t++)
        {
            scores.Load(t);
            for (var k = 0; k < scores.K; k++) Assert.Equal(expected[(t * scores.K) + k], scores.Score[k], Identity);

            var cross = new double[scores.J * scores.K];
            var omega = new double[scores.J * scores.J];
            var information = new double[scores.K * scores.K];
            for (var i = 0; i < scores.J; i++)
            {
                if (scores.Probability[i] == 0) continue;
                scores.Hypothetical(i, g, s);
                for (var j = 0; j < scores.J; j++)
                {
                    for (var k = 0; k < scores.J; k++) omega[(j * scores.J) + k] += scores.Probability[i] * g[j] * g[k];
                    for (var k = 0; k < scores.K; k++) cross[(j * scores.K) + k] += scores.Probability[i] * g[j] * s[k];
                }

                for (var k = 0; k < scores.K; k++)
                    for (var q = 0; q < scores.K; q++) information[(k * scores.K) + q] += scores.Probability[i] * s[k] * s[q];
            }

            var added = new double[scores.K * scores.K];
            scores.AddInformation(added);
            for (var c = 0; c < cross.Length; c++) Assert.Equal(cross[c], scores.Cross[c], Identity);
            for (var c = 0; c < information.Length; c++) Assert.Equal(information[c], added[c], Identity);
            for (var j = 0; j < scores.J; j++)
                for (var k = 0; k < scores.J; k++) Assert.Equal(omega[(j * scores.J) + k], scores.OmegaAt(j, k), Identity);
        }
    }

    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled)]
    [InlineData(NestedLogitForm.Unscaled)]
    public void Residuals_equal_differences_of_log_probabilities(NestedLogitForm form)
    {
        var random = new PanelChoice.Numerics.CounterRandom(2, "utilities", 0);
        var tree = new TreeProbabilities(made.Tree, form);
        double[] l = [0.45, 0.7, 0.6, 1];
        tree.SetDissimilarities([.. made.Tree.Nodes.Select((n, i) => i == made.Tree.Root ? 1 : l[i])]);
        var byValue = new double[6 + made.Tree.Nodes.Length];
        var byDissimilarity = new double[made.Tree.Nodes.Length];
        for (var trial = 0; trial < 20; trial++)
        {
            var v = Enumerable.Range(0, 6).Select(_ => (4 * random.NextDouble()) - 2).ToArray();
            var offered = Enumerable.Range(0, 6).Select(j => j == 0 || random.NextDouble() < 0.8).ToArray();
            var chosen = Enumerable.Range(0, 6).First(j => offered[j] && (j >= trial % 3 || j == 5 || !offered.Skip(j + 1).Any(x => x)));
            tree.Compute(v, offered);
            tree.Gradient(chosen, byValue, byDissimilarity);
            var g = byValue[..6];
            for (var j = 0; j < 6; j++)
            {
                double At(double by)
                {
                    var shifted = (double[])v.Clone();
                    shifted[j] += by;
                    tree.Compute(shifted, offered);
                    return tree.LogProbability(chosen);
                }

                const double h = 1e-3;
                var numeric = ((8 * (At(h) - At(-h))) - (At(2 * h) - At(-2 * h))) / (12 * h);
                Assert.InRange(Math.Abs(numeric - (offered[j] ? g[j] : 0)), 0, Difference * Math.Max(1, Math.Abs(g[j])));
            }
        }
    }

    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled)]
    [InlineData(NestedLogitForm.Unscaled)]
    public void Expected_information_equals_minus_the_expected_Hessian(NestedLogitForm form)
    {
        // Sum over hypothetical choices of P_i times minus the second derivatives of log P(i): the information identity, by differences.
        var design = made.Design(form);
        var k = design.Layout.Count;
        var information = new double[k * k];
        const double h = 1e-3;
        var s = new double[k];
        var g = new double[6];
        double[] Shift(int parameter, double by)
        {
            var x = (double[])made.Truth.Clone();
            x[parameter] += by;
            return x;
        }

        for (var q = 0; q < k; q++)
        {
            var weights = new[] { (h, 8.0), (-h, -8.0), (2 * h, -1.0), (-2 * h, 1.0) };
            foreach (var (by, weight) in weights)
            {
                var shifted = new SituationScores(design, form, Shift(q, by), null);
                var here = new SituationScores(design, form, made.Truth, null);
                for (var t = 0; t < design.Situations; t++)
                {
                    here.Load(t);
                    shifted.Load(t);
                    for (var i = 0; i < 6; i++)
                    {
                        if (here.Probability[i] == 0) continue;
                        shifted.Hypothetical(i, g, s);
                        for (var r = 0; r < k; r++) information[(r * k) + q] -= here.Probability[i] * weight * s[r] / (12 * h);
                    }
                }
            }
        }

        var white = Whitening.Of(design, form, made.Truth, 1)!;
        var scale = white.Information.Max(Math.Abs);
        for (var c = 0; c < information.Length; c++) Assert.InRange(Math.Abs(information[c] - white.Information[c]), 0, Difference * scale);
    }

    [Fact]
    public void A_singular_information_is_refused()
    {
        double[] singular = [2, 1, 1, 0.5];
        Assert.Null(Whitening.BasisOf(singular, 2));
        Assert.Null(Whitening.BasisOf([1, 0, 0, 0], 2));
        Assert.Null(Whitening.BasisOf([1, double.NaN, double.NaN, 1], 2));
        Assert.NotNull(Whitening.BasisOf([2, 1, 1, 1], 2));
    }
}
