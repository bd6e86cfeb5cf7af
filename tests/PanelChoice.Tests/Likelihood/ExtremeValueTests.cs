using System.Collections.Immutable;
using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

public class ExtremeValueTests
{
    private const int Cases = 8;

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Huge_utilities_give_finite_figures_and_the_limit_in_which_a_nest_is_worth_its_best_member(string kernel, NestedLogitForm form)
    {
        for (var seed = 201; seed < 201 + Cases; seed++)
            foreach (var size in (double[])[1e3, 1e4, 1e5])
            {
                var made = RandomTreeCase.Make(seed, lowest: 0.01, highest: seed % 2 == 0 ? 1 : 20);
                made = made with { Coefficients = [.. made.Coefficients.Select(b => size * b)] };
                var likelihood = Kernels.Create(kernel, made.Design(form), form);
                var all = likelihood.Evaluate(made.Point, made.Weight, Derivatives.Hessian);
                Assert.True(double.IsFinite(all.Value));
                Assert.All(all.Gradient, g => Assert.True(double.IsFinite(g)));
                Assert.All(all.Hessian, h => Assert.True(double.IsFinite(h)));

                var log = likelihood.LogProbabilities(made.Point);
                for (var s = 0; s < log.Length; s++)
                {
                    var (limit, within) = Limit(made, form, s);
                    Assert.InRange(log[s], double.NegativeInfinity, 0);
                    Assert.InRange(Math.Abs(log[s] - limit), 0, within + (1e-12 * Math.Abs(limit)));
                }
            }
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void A_choice_far_better_than_the_rest_has_log_probability_zero_and_no_gradient(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(7, lowest: 0.01, highest: 1);
        int[] everything = [.. Enumerable.Range(0, made.Names.Length)];
        double[][] isChosen = [.. made.Chosen.Select(c => everything.Select(j => j == c ? 1.0 : 0).ToArray())];
        made = made with { Terms = [.. made.Terms, new RandomTerm(everything, false, isChosen)], Coefficients = [.. made.Coefficients, 1e7] };
        var likelihood = Kernels.Create(kernel, made.Design(form), form);
        Assert.All(likelihood.LogProbabilities(made.Point), log => Assert.Equal(0, log));
        Assert.All(likelihood.Scores(made.Point), score => Assert.InRange(Math.Abs(score), 0, 1e-12));
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Parameters_for_which_the_model_is_not_defined_give_NaN_everywhere(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(1);
        Assert.NotEmpty(made.Dissimilarity);
        var likelihood = Kernels.Create(kernel, made.Design(form), form);
        var last = made.Point.Length - 1;
        foreach (var (place, wrong) in ((int, double)[])
            [(0, double.NaN), (0, double.PositiveInfinity), (0, double.NegativeInfinity), (last, double.NaN), (last, 0), (last, -0.5)])
        {
            var point = made.Point;
            point[place] = wrong;
            var all = likelihood.Evaluate(point, made.Weight, Derivatives.Hessian);
            Assert.True(double.IsNaN(all.Value));
            Assert.Equal(point.Length, all.Gradient.Length);
            Assert.Equal(point.Length * point.Length, all.Hessian.Length);
            var sums = likelihood.SumScores(point, made.Weight);
            Assert.All(
                [
                    .. all.Gradient, .. all.Hessian, .. likelihood.LogProbabilities(point), .. likelihood.Scores(point), .. likelihood.PersonInformation(point),
                    .. sums.ByPerson, .. sums.Products,
                ],
                x => Assert.True(double.IsNaN(x)));
        }
    }

    /// <summary>
    /// Log P when every log-sum is replaced by its largest member, and how far the true figure may lie from it: a log-sum of C members exceeds the
    /// largest by at most log C.
    /// </summary>
    private static (double Limit, double Within) Limit(RandomTreeCase made, NestedLogitForm form, int s)
    {
        var design = made.Design(form);
        var tree = design.Tree;
        var J = tree.Alternatives.Length;
        var value = Enumerable.Repeat(double.NegativeInfinity, J + tree.Nodes.Length).ToArray();
        var slack = new double[value.Length];
        for (var j = 0; j < J; j++)
            if (made.Offered[s][j])
                value[j] = Enumerable.Range(0, made.Terms.Length).Where(k => made.Terms[k].Enters.Contains(j)).Sum(k => made.Coefficients[k] * made.Terms[k].Value[s][j]);

        var (limit, within, onPath) = (0.0, 0.0, made.Chosen[s]);
        for (var n = 0; n < tree.Nodes.Length; n++)
        {
            var l = design.Layout.NodeParameter[n] is >= 0 and var q ? made.Point[q] : 1;
            var scale = form == NestedLogitForm.UtilityScaled ? l : 1;
            ImmutableArray<int> offered = [.. tree.Nodes[n].Children.Where(c => !double.IsNegativeInfinity(value[c]))];
            if (offered.IsEmpty) continue;
            var best = offered.Max(c => value[c]);
            var inner = offered.Max(c => slack[c]) + (scale * Math.Log(offered.Length));
            value[J + n] = l / scale * best;
            slack[J + n] = l / scale * inner;
            if (!offered.Contains(onPath)) continue;
            limit += (value[onPath] - best) / scale;
            within += (slack[onPath] + inner) / scale;
            onPath = J + n;
        }

        return (limit, within);
    }
}
