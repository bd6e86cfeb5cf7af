using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

public class ScalarDerivativeTests
{
    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled)]
    [InlineData(NestedLogitForm.Unscaled)]
    public void Gradient_and_Hessian_equal_five_point_differences_on_a_three_level_tree(NestedLogitForm form)
    {
        var made = SyntheticPanel.Make(
            11, 12, 5, 6,
            [SyntheticPanel.Nest("inner", "A", "B"), SyntheticPanel.Nest("outer", "inner", "C"), SyntheticPanel.Nest("other", "D", "E")],
            [0.45, 0.7, 0.6]);
        var likelihood = new ScalarNestedLogit(made.Design(form), form, 1);
        var weight = Enumerable.Range(0, 12).Select(i => 0.5 + (0.25 * (i % 4))).ToArray();
        var at = made.Truth;
        var exact = likelihood.Evaluate(at, weight, Derivatives.Hessian);
        for (var k = 0; k < at.Length; k++)
        {
            var numeric = Difference(at, k, x => likelihood.Evaluate(x, weight, Derivatives.None).Value);
            Assert.InRange(Math.Abs(numeric - exact.Gradient[k]), 0, 1e-7 * Math.Max(1, Math.Abs(exact.Gradient[k])));
            for (var q = 0; q < at.Length; q++)
            {
                var q0 = q;
                var second = Difference(at, k, x => likelihood.Evaluate(x, weight, Derivatives.Gradient).Gradient[q0]);
                Assert.InRange(Math.Abs(second - exact.Hessian[(k * at.Length) + q]), 0, 1e-7 * Math.Max(1, Math.Abs(second)));
            }
        }
    }

    private static double Difference(double[] at, int k, Func<double[], double> f)
    {
        const double h = 1e-3;
        double Shift(double by)
        {
            var x = (double[])at.Clone();
            x[k] += by;
            return f(x);
        }

        return ((8 * (Shift(h) - Shift(-h))) - (Shift(2 * h) - Shift(-2 * h))) / (12 * h);
    }
}
