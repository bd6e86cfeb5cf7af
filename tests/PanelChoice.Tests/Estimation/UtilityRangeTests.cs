using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

public class UtilityRangeTests
{
    [Fact]
    public void Local_bounds_are_where_mixed_derivatives_of_probabilities_change_their_sign()
    {
        // A nest of three and one alternative beside it, utilities as they come; differences stand in for derivatives.
        var tree = SyntheticPanel.TreeOf(["A", "B", "C", "D"], [SyntheticPanel.Nest("n", "A", "B", "C")]);
        double[] utility = [-1, -1.5, -1.2, 4];
        foreach (var form in new[] { NestedLogitForm.UtilityScaled, NestedLogitForm.Unscaled })
        {
            var (first, second) = (Crossing(l => First(l, form)), Crossing(l => -Second(l, form)));
            Assert.Equal(UtilityRange.LocalBound(P(first, form), 2), first, 1e-4);
            Assert.Equal(UtilityRange.LocalBound(P(second, form), 3), second, 1e-3);
            Assert.True(second < first);
        }

        double P(double l, NestedLogitForm form) => At(l, form, 0, 0)[4];
        double First(double l, NestedLogitForm form) => (At(l, form, 1e-5, 0)[0] - At(l, form, -1e-5, 0)[0]) / 2e-5;
        double Second(double l, NestedLogitForm form) =>
            (At(l, form, 1e-3, 1e-3)[0] - At(l, form, 1e-3, -1e-3)[0] - At(l, form, -1e-3, 1e-3)[0] + At(l, form, -1e-3, -1e-3)[0]) / 4e-6;

        double[] At(double l, NestedLogitForm form, double b, double c)
        {
            var probabilities = new TreeProbabilities(tree, form);
            probabilities.SetDissimilarities([l, 1]);
            probabilities.Compute([utility[0], utility[1] + b, utility[2] + c, utility[3]], [true, true, true, true]);
            return probabilities.Probability;
        }

        // Below the bound the function is negative, above it positive.
        double Crossing(Func<double, double> f) => MathNet.Numerics.RootFinding.Brent.FindRoot(f, 0.9, 1.9, 1e-10, 200);
    }

    [Fact]
    public void Up_to_one_every_probability_is_within_both_bounds()
    {
        for (var p = 0.0; p < 1; p += 0.01)
        {
            Assert.True(UtilityRange.LocalBound(p, 2) >= 1 - 1e-12);
            Assert.InRange(UtilityRange.LocalBound(p, 3), 1 - 1e-12, UtilityRange.LocalBound(p, 2));
        }

        Assert.Equal(double.PositiveInfinity, UtilityRange.LocalBound(0.2, 1));
    }

    [Fact]
    public void The_share_counts_occasions_one_by_one()
    {
        var made = SyntheticPanel.Make(3, 40, 8, 4, [SyntheticPanel.Nest("n", "A", "B", "C")], [1.35], habit: null);
        var model = Fits.Fit(made);
        Assert.Equal(FitStatus.Converged, model.Status);
        var nest = UtilityRange.Of(model, WorkContext.Quiet)[0];
        Assert.Equal((model.Parameters[^1], 1.0, false), (nest.Estimate, nest.Bound, nest.Globally));
        Assert.True(nest.Estimate > 1);

        var panel = made.Panel;
        var tree = new TreeProbabilities(made.Tree, NestedLogitForm.UtilityScaled);
        tree.SetDissimilarities([nest.Estimate, 1]);
        int wide = 0, within = 0;
        for (var o = 0; o < panel.Occasions; o++)
        {
            var offered = panel.Offered.AsSpan(o * 4, 4).ToArray();
            var utility = new double[4];
            for (var c = 0; c < made.Covariates.Covariates.Length; c++)
            {
                var covariate = made.Covariates.Covariates[c];
                for (var i = 0; i < covariate.Enters.Length; i++)
                    utility[covariate.Enters[i]] += model.Parameters[c] * (covariate.IsConstant ? 1 : covariate.Values[(o * covariate.Enters.Length) + i]);
            }

            tree.Compute(utility, offered);
            var members = offered.Take(3).Count(x => x);
            if (members < 2) continue;
            wide++;
            if (nest.Estimate <= UtilityRange.LocalBound(tree.Probability[4], members)) within++;
        }

        Assert.Equal(wide, nest.Locally!.Occasions);
        Assert.Equal((double)within / wide, nest.Locally.Share, 1e-12);
        Assert.InRange(within, 1, wide - 1);
        Assert.Equal(nest, UtilityRange.Of(model, WorkContext.Quiet with { Threads = 3 })[0]);
    }

    [Fact]
    public void A_nest_below_another_is_bounded_by_all_above_and_has_no_local_bounds()
    {
        var made = SyntheticPanel.Make(4, 60, 8, 4, [SyntheticPanel.Nest("inner", "A", "B"), SyntheticPanel.Nest("outer", "inner", "C")], [0.4, 0.7]);
        var model = Fits.Fit(made);
        var (inner, outer) = (UtilityRange.Of(model, WorkContext.Quiet)[0], UtilityRange.Of(model, WorkContext.Quiet)[1]);
        Assert.Equal((Math.Min(1, outer.Estimate), inner.Estimate <= Math.Min(1, outer.Estimate)), (inner.Bound, inner.Globally));
        Assert.Null(inner.Locally);
        Assert.NotNull(inner.Reason);
        Assert.Equal(1, outer.Bound);
        Assert.NotNull(outer.Locally);
    }
}
