using PanelChoice.Optimisation;
using Xunit;

namespace PanelChoice.Tests.Optimisation;

public class TrustRegionNewtonTests
{
    [Theory]
    [InlineData(-1.2, 1)]
    [InlineData(5, -7)]
    [InlineData(-30, 40)]
    public void Finds_the_bottom_of_a_curved_valley_from_near_and_far(double x, double y)
    {
        // Rosenbrock 1960.
        var found = TrustRegionNewton.Minimise(Valley, [x, y], new MinimisationSettings());
        Assert.Equal(Termination.DecrementReached, found.Termination);
        Assert.Equal(1, found.Point[0], 9);
        Assert.Equal(1, found.Point[1], 9);
        Assert.Equal(found.Evaluations, found.Iterations + 1);
    }

    [Fact]
    public void Leaves_a_saddle_point_it_starts_on_exactly()
    {
        // x^2 - y^2 + y^4 / 4: a saddle at 0, minima at y = +-sqrt 2 with value -1.
        var found = TrustRegionNewton.Minimise(
            x => new SmoothValue(
                (x[0] * x[0]) - (x[1] * x[1]) + (Math.Pow(x[1], 4) / 4),
                [2 * x[0], (-2 * x[1]) + Math.Pow(x[1], 3)],
                [2, 0, 0, -2 + (3 * x[1] * x[1])]),
            [0, 0], new MinimisationSettings());
        Assert.True(found.IsMinimum);
        Assert.Equal(-1, found.Value, 12);
        Assert.Equal(Math.Sqrt(2), Math.Abs(found.Point[1]), 9);
    }

    [Fact]
    public void A_direction_that_does_not_matter_is_left_where_it_started()
    {
        // ((x + y) - 3)^2 depends on the sum alone.
        var found = TrustRegionNewton.Minimise(
            x =>
            {
                var d = x[0] + x[1] - 3;
                return new SmoothValue(d * d, [2 * d, 2 * d], [2, 2, 2, 2]);
            },
            [4, 1], new MinimisationSettings());
        Assert.True(found.IsMinimum);
        Assert.Equal(3, found.Point[0] + found.Point[1], 9);
        Assert.Equal(3, found.Point[0] - found.Point[1], 6);
    }

    [Fact]
    public void Steps_back_from_where_the_function_is_not_finite()
    {
        // x - log x is not defined at x <= 0; the first Newton step from 3 lands at -3.
        var undefined = 0;
        var found = TrustRegionNewton.Minimise(
            x =>
            {
                if (x[0] <= 0) undefined++;
                return new SmoothValue(x[0] > 0 ? x[0] - Math.Log(x[0]) : double.NaN, [1 - (1 / x[0])], [1 / (x[0] * x[0])]);
            },
            [3], new MinimisationSettings(InitialRadius: 10));
        Assert.True(undefined > 0);
        Assert.True(found.IsMinimum);
        Assert.Equal(1, found.Point[0], 10);
    }

    [Fact]
    public void A_start_that_is_not_finite_is_said_so()
    {
        var found = TrustRegionNewton.Minimise(_ => new SmoothValue(double.NaN, [0], [1]), [2], new MinimisationSettings());
        Assert.Equal(Termination.StartNotFinite, found.Termination);
        Assert.Equal(2, found.Point[0]);
    }

    [Fact]
    public void A_function_without_a_minimum_ends_at_the_limit_with_its_best_point()
    {
        var found = TrustRegionNewton.Minimise(x => new SmoothValue(-x[0], [-1], [0]), [0], new MinimisationSettings(MaxIterations: 20));
        Assert.Equal(Termination.IterationLimit, found.Termination);
        Assert.Equal(20, found.Iterations);
        Assert.Equal(-found.Point[0], found.Value);
        Assert.True(found.Point[0] > 20);
    }

    [Fact]
    public void A_gradient_that_contradicts_the_function_ends_without_progress()
    {
        var found = TrustRegionNewton.Minimise(x => new SmoothValue(x[0], [-1], [1]), [0], new MinimisationSettings(MaxIterations: 10_000));
        Assert.Equal(Termination.NoProgress, found.Termination);
        Assert.Equal(0, found.Point[0]);
    }

    [Fact]
    public void A_function_that_turns_to_NaN_everywhere_else_does_not_loop()
    {
        var found = TrustRegionNewton.Minimise(
            x => x[0] == 1 ? new SmoothValue(1, [1], [1]) : new SmoothValue(double.NaN, [double.NaN], [double.NaN]), [1],
            new MinimisationSettings(MaxIterations: 10_000));
        Assert.Equal(Termination.NoProgress, found.Termination);
        Assert.True(found.Iterations < 100);
    }

    [Fact]
    public void Stops_where_it_is_asked_to()
    {
        var seen = 0;
        var found = TrustRegionNewton.Minimise(Valley, [-1.2, 1], new MinimisationSettings(), _ => ++seen == 4);
        Assert.Equal(Termination.AskedToStop, found.Termination);
        Assert.Equal(4, seen);
    }

    [Fact]
    public void The_quadratic_finish_goes_on_below_the_rounding_of_the_value()
    {
        // A large constant hides the last 8 digits of the valley's value; the gradient still leads to the bottom.
        var found = TrustRegionNewton.Minimise(
            x =>
            {
                var at = Valley(x);
                return at with { Value = at.Value + 1e8 };
            },
            [-1.2, 1], new MinimisationSettings());
        Assert.True(found.IsMinimum);
        Assert.Equal(1, found.Point[0], 8);
    }

    [Fact]
    public void The_unchecked_last_step_is_as_good_as_a_checked_one()
    {
        var exact = TrustRegionNewton.Minimise(Logistic, [0, 0], new MinimisationSettings());
        var cheap = TrustRegionNewton.Minimise(Logistic, [0, 0], new MinimisationSettings(UncheckedLastStep: 1e-5));
        Assert.Equal(exact.Evaluations - 1, cheap.Evaluations);
        for (var i = 0; i < 2; i++) Assert.Equal(exact.Point[i], cheap.Point[i], 9);
        Assert.Equal(exact.Value, cheap.Value, 12);
    }

    [Fact]
    public void Agrees_with_a_certified_nonlinear_regression_from_both_published_starts()
    {
        // NIST StRD, data set Misra1a (y = b1 (1 - exp(-b2 x))): certified values and data quoted from the published file.
        double[] x = [77.6, 114.9, 141.1, 190.8, 239.9, 289.0, 332.8, 378.4, 434.8, 477.3, 536.8, 593.1, 689.1, 760.0];
        double[] y = [10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02, 44.82, 50.76, 55.05, 61.01, 66.40, 75.47, 81.78];
        SmoothValue SumOfSquares(ReadOnlySpan<double> scaled)
        {
            // Coordinates of size 1: b1 / 100 and b2 / 1e-4.
            double[] unit = [100, 1e-4];
            var (b1, b2) = (scaled[0] * unit[0], scaled[1] * unit[1]);
            double value = 0;
            double[] g = [0, 0], h = [0, 0, 0, 0];
            for (var i = 0; i < x.Length; i++)
            {
                var e = Math.Exp(-b2 * x[i]);
                var r = y[i] - (b1 * (1 - e));
                double[] d = [-(1 - e), -b1 * x[i] * e];
                double[] dd = [0, -x[i] * e, -x[i] * e, b1 * x[i] * x[i] * e];
                value += r * r;
                for (var a = 0; a < 2; a++)
                {
                    g[a] += 2 * r * d[a] * unit[a];
                    for (var b = 0; b < 2; b++) h[(2 * a) + b] += 2 * ((d[a] * d[b]) + (r * dd[(2 * a) + b])) * unit[a] * unit[b];
                }
            }

            return new SmoothValue(value, g, h);
        }

        foreach (var start in new[] { new[] { 5.0, 1 }, new[] { 2.5, 5 } })
        {
            var found = TrustRegionNewton.Minimise(SumOfSquares, start, new MinimisationSettings());
            Assert.True(found.IsMinimum);
            Assert.InRange(Math.Abs((found.Point[0] * 100 / 2.3894212918e2) - 1), 0, 1e-10);
            Assert.InRange(Math.Abs((found.Point[1] * 1e-4 / 5.5015643181e-4) - 1), 0, 1e-10);
            Assert.InRange(Math.Abs((found.Value / 1.2455138894e-1) - 1), 0, 1e-10);
        }
    }

    private static SmoothValue Valley(ReadOnlySpan<double> x)
    {
        var (a, b) = (1 - x[0], x[1] - (x[0] * x[0]));
        return new SmoothValue(
            (a * a) + (100 * b * b),
            [(-2 * a) - (400 * x[0] * b), 200 * b],
            [2 - (400 * b) + (800 * x[0] * x[0]), -400 * x[0], -400 * x[0], 200]);
    }

    private static SmoothValue Logistic(ReadOnlySpan<double> b)
    {
        double value = 0;
        double[] g = [0, 0], h = [0, 0, 0, 0];
        for (var i = 0; i < 50; i++)
        {
            double[] x = [1, Math.Sin(i)];
            var u = (b[0] * x[0]) + (b[1] * x[1]);
            var p = 1 / (1 + Math.Exp(-u));
            var taken = Math.Sin(3.7 * i) + (0.5 * Math.Sin(i)) > 0 ? 1 : 0;
            value -= taken == 1 ? Math.Log(p) : Math.Log(1 - p);
            for (var a = 0; a < 2; a++)
            {
                g[a] += (p - taken) * x[a];
                for (var c = 0; c < 2; c++) h[(2 * a) + c] += p * (1 - p) * x[a] * x[c];
            }
        }

        return new SmoothValue(value, g, h);
    }
}
