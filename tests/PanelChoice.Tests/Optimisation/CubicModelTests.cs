using PanelChoice.Optimisation;
using Xunit;

namespace PanelChoice.Tests.Optimisation;

public class CubicModelTests
{
    /// <summary>f(x) = x0^2 + x1^2 / 2 + x0 x1 / 4 + c (x0^3 + x0^2 x1), around 0, with a slope.</summary>
    private static CubicModel Model(double slope, double c) => new(
        [slope, -slope], [2, 0.25, 0.25, 1], [6, 2, 2, 0, 2, 0, 0, 0], c);

    [Fact]
    public void The_minimiser_has_no_slope_and_positive_curvature()
    {
        var model = Model(0.3, 0.2);
        var d = model.Minimiser()!;
        double[] gradient =
        [
            0.3 + (2 * d[0]) + (0.25 * d[1]) + (0.2 * ((3 * d[0] * d[0]) + (2 * d[0] * d[1]))), -0.3 + (0.25 * d[0]) + d[1] + (0.2 * d[0] * d[0]),
        ];
        Assert.All(gradient, g => Assert.InRange(Math.Abs(g), 0, 1e-12));
        var hessian = model.HessianAt(d);
        Assert.Equal([2 + (0.2 * ((6 * d[0]) + (2 * d[1]))), 0.25 + (0.4 * d[0]), 0.25 + (0.4 * d[0]), 1], hessian, (a, b) => Math.Abs(a - b) < 1e-14);
    }

    [Fact]
    public void Where_the_cubic_falls_without_end_there_is_none() => Assert.Null(Model(3, 2).Minimiser());

    [Fact]
    public void Where_the_curvature_is_negative_there_is_none() => Assert.Null(new CubicModel([1], [-1], [0], 1).Minimiser());
}
