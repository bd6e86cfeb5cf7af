using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

public class EstimationPartsTests
{
    private static readonly SyntheticPanel Tree = SyntheticPanel.Make(
        61, 12, 5, 5, [SyntheticPanel.Nest("inner", "A", "B"), SyntheticPanel.Nest("outer", "inner", "C")], [0.5, 1.7]);

    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled)]
    [InlineData(NestedLogitForm.Unscaled)]
    public void The_function_minimised_has_the_derivatives_it_says(NestedLogitForm form)
    {
        var design = Tree.Design(form);
        var weight = Enumerable.Range(0, 12).Select(p => 1.0 + p).ToArray();
        var function = new MinusLogLikelihood(
            LikelihoodKernel.Create(design, form, 1), weight, ColumnSurvey.Of(design, 1).Scale, [0, 2, 4, 5, 6, 7], Tree.Truth);
        var at = function.Coordinates(Tree.Truth);
        var exact = function.Evaluate(at);
        for (var k = 0; k < Tree.Truth.Length; k++) Assert.Equal(Tree.Truth[k], function.Parameters(at)[k], 14);
        for (var i = 0; i < at.Length; i++)
        {
            double[] Shift(double by)
            {
                var x = (double[])at.Clone();
                x[i] += by;
                return x;
            }

            const double h = 1e-3;
            double Difference(Func<double[], double> f) => ((8 * (f(Shift(h)) - f(Shift(-h)))) - (f(Shift(2 * h)) - f(Shift(-2 * h)))) / (12 * h);
            Assert.InRange(Math.Abs(Difference(x => function.Evaluate(x).Value) - exact.Gradient[i]), 0, 1e-8 * Math.Max(1, Math.Abs(exact.Gradient[i])));
            for (var j = 0; j < at.Length; j++)
            {
                var numeric = Difference(x => function.Evaluate(x).Gradient[j]);
                Assert.InRange(Math.Abs(numeric - exact.Hessian[(i * at.Length) + j]), 0, 1e-7 * Math.Max(1, Math.Abs(numeric)));
            }
        }
    }

    [Theory]
    [InlineData(1e-8)]
    [InlineData(0.004)]
    [InlineData(0.0923)]
    [InlineData(0.3)]
    [InlineData(1)]
    [InlineData(29)]
    [InlineData(900)]
    public void A_dissimilarity_survives_its_coordinate(double l) =>
        Assert.InRange(Math.Abs((MinusLogLikelihood.Dissimilarity(MinusLogLikelihood.Coordinate(l)) / l) - 1), 0, 1e-14);

    [Fact]
    public void Reference_log_likelihoods_equal_fits_of_the_same_models()
    {
        var made = SyntheticPanel.Make(62, 30, 6, 4, [], []);
        var weight = Enumerable.Range(0, 30).Select(p => 0.5 + (p % 3)).ToArray();
        var full = Fits.Fit(made.Design() with { PersonWeight = [.. weight] }, NestedLogitForm.UtilityScaled, 1);
        var constants = made with { Covariates = made.Covariates with { Covariates = [.. made.Covariates.Covariates.Take(3)] } };
        var alone = Fits.Fit(constants.Design() with { PersonWeight = [.. weight] }, NestedLogitForm.UtilityScaled, 1);
        Assert.Equal(alone.LogLikelihood, full.LogLikelihoodConstants!.Value, 9);
        Assert.Equal(alone.LogLikelihood, alone.LogLikelihoodConstants!.Value, 9);
        var equal = alone.Likelihood.Evaluate(new double[3], weight, Derivatives.None).Value;
        Assert.Equal(equal, full.LogLikelihoodEqualProbability, 9);
    }

    [Fact]
    public void Constants_alone_have_no_maximum_when_one_alternative_beats_another_always()
    {
        // A and B compete with each other, C and D too, and A or B are always preferred where both pairs meet.
        var made = SyntheticPanel.Make(63, 30, 6, 4, [], [], offeredShare: 0.6);
        var chosen = made.Panel.Chosen.Select((j, o) => made.Panel.Offered[o * 4] && j > 1 ? 0 : made.Panel.Offered[(o * 4) + 1] && j > 1 ? 1 : j);
        var fit = Fits.Fit(made with { Covariates = made.Covariates with { Panel = made.Panel with { Chosen = [.. chosen] } } });
        Assert.Null(fit.LogLikelihoodConstants);
        Assert.Equal(FitStatus.Separated, fit.Status);
        var about = Assert.Single(fit.Findings, f => f.Id == "fit.separated").Parameters.Select(k => fit.Layout.Parameters[k].Label);
        Assert.Equal(["constant [C]", "constant [D]"], about);
    }

    [Fact]
    public void Grid_points_keep_children_at_most_as_large_as_parents_and_know_their_neighbours()
    {
        var design = Tree.Design();
        var grid = new StartingPoints(design, NestedLogitForm.UtilityScaled).Grid();
        Assert.All(grid, g => Assert.True(g.Values[0] <= g.Values[1]));
        Assert.Equal([1.0, 1.0], grid[0].Values);
        Assert.Equal(21, grid.Length);
        for (var i = 0; i < grid.Length; i++)
        {
            Assert.InRange(grid[i].Neighbours.Length, 1, 4);
            Assert.All(grid[i].Neighbours, n => Assert.Contains(i, grid[n].Neighbours));
        }

        Assert.Equal(36, new StartingPoints(Tree.Design(NestedLogitForm.Unscaled), NestedLogitForm.Unscaled).Grid().Length);
    }

    [Fact]
    public void Seeded_points_are_in_order_and_depend_on_seed_and_number_alone()
    {
        var points = new StartingPoints(Tree.Design(), NestedLogitForm.UtilityScaled);
        var scale = Enumerable.Repeat(1.0, Tree.Truth.Length).ToArray();
        double[] At(long seed, int number) => points.Seeded(Tree.Truth, [0, 1, 2, 3, 4, 5], scale, seed, number);
        for (var i = 0; i < 50; i++)
        {
            var at = At(7, i);
            Assert.True(0.05 <= at[6] && at[6] <= at[7] && at[7] <= 2);
        }

        Assert.Equal(At(7, 3), At(7, 3));
        Assert.NotEqual(At(7, 3), At(7, 4));
        Assert.NotEqual(At(7, 3), At(8, 3));
    }

    [Fact]
    public void Evidence_is_kept_by_cluster()
    {
        var made = SyntheticPanel.Make(64, 6, 5, 3, [SyntheticPanel.Nest("pair", "A", "B")], [0.6], offeredShare: 1);
        made = Fits.Add(made, Fits.Shared(made, "card", (o, j) => o / 5 == 2 && j == 1 ? 1 : 0));
        var survey = ColumnSurvey.Of(made.Design(), 1);
        Assert.True(survey.Whole()[4].HasFlag(Evidence.Varies));
        Assert.Equal(Evidence.None, survey.Of([1, 1, 0, 1, 1, 1])[4]);
        Assert.True(survey.Of([0, 0, 2, 0, 0, 0])[4].HasFlag(Evidence.Varies));
        Assert.True(survey.Whole()[5].HasFlag(Evidence.Varies));
        Assert.Equal(Evidence.None, survey.Of(new double[6])[5]);
    }
}
