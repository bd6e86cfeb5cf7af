using PanelChoice.Diagnostics;
using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Likelihood;
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
    public void Residuals_have_mean_zero_and_in_the_scaled_form_sum_to_zero(NestedLogitForm form)
    {
        var situations = new EnumeratedSituations(made.Design(form), form, made.Truth);
        foreach (var s in situations)
        {
            var mean = new double[situations.Size];
            for (var i = 0; i < s.P.Length; i++)
            {
                if (s.F[i] is not { } f) continue;
                if (form == NestedLogitForm.UtilityScaled) Assert.InRange(Math.Abs(f.Take(s.P.Length).Sum()), 0, Identity);
                for (var r = 0; r < mean.Length; r++) mean[r] += s.P[i] * f[r];
            }

            Assert.Equal(1, s.P.Sum(), Identity);
            Assert.All(mean, x => Assert.InRange(Math.Abs(x), 0, Identity));
        }
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Observed_scores_equal_those_of_the_likelihood_and_covariances_equal_enumeration(string kernel, NestedLogitForm form)
    {
        var design = made.Design(form);
        var expected = new ScalarNestedLogit(design, form, 1).Scores(made.Truth);
        var situations = new EnumeratedSituations(design, form, made.Truth).ToList();
        var seen = 0;
        ResidualKernel.Create(design, form, made.Truth, kernel).Lend(residuals =>
        {
            var scores = new SituationScores(residuals, null);
            var (J, K) = (scores.J, scores.K);
            var vector = Enumerable.Range(0, scores.Width).Select(k => k < K ? Math.Sin(k + 1) : 0).ToArray();
            var product = new double[scores.Width];
            foreach (var block in design.Blocks)
                scores.ForEach(block, t =>
                {
                    seen++;
                    var here = situations[t];
                    for (var k = 0; k < K; k++) Assert.Equal(expected[(t * K) + k], scores.Score[k], Identity);
                    for (var j = 0; j < J; j++)
                    {
                        Assert.Equal(here.P[j], scores.Probability[j], Identity);
                        Assert.Equal(here.F[here.Chosen]![j], scores.Residual[j], Identity);
                        for (var k = 0; k < J; k++) Assert.Equal(Expected(here, i => here.F[i]![j] * here.F[i]![k]), scores.OmegaAt(j, k), Identity);
                        for (var k = 0; k < K; k++) Assert.Equal(Expected(here, i => here.F[i]![j] * here.S[i]![k]), scores.Cross[(j * scores.Width) + k], Identity);
                    }

                    scores.SetInformation();
                    var information = PaddedRows.Symmetric(scores.Information, K);
                    scores.ApplyInformation(vector, product);
                    for (var k = 0; k < K; k++)
                    {
                        for (var q = 0; q < K; q++) Assert.Equal(Expected(here, i => here.S[i]![k] * here.S[i]![q]), information[(k * K) + q], Identity);
                        Assert.Equal(Enumerable.Range(0, K).Sum(q => information[(k * K) + q] * vector[q]), product[k], Identity);
                    }
                });
        });
        Assert.Equal(design.Situations, seen);
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
                foreach (var (here, shifted) in new EnumeratedSituations(design, form, made.Truth).Zip(new EnumeratedSituations(design, form, Shift(q, by))))
                    for (var i = 0; i < 6; i++)
                        if (here.F[i] is not null)
                            for (var r = 0; r < k; r++) information[(r * k) + q] -= here.P[i] * weight * shifted.S[i]![r] / (12 * h);
        }

        var white = Whitening.Of(ResidualKernel.Create(design, form, made.Truth), 1)!;
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

    private static double Expected(BruteForce.Row situation, Func<int, double> of) =>
        Enumerable.Range(0, situation.P.Length).Where(i => situation.F[i] is not null).Sum(i => situation.P[i] * of(i));
}
