using FsCheck.Xunit;
using PanelChoice.Numerics;
using PanelChoice.Optimisation;
using Xunit;

namespace PanelChoice.Tests.Optimisation;

public class TrustRegionStepTests
{
    [Property(MaxTest = 200)]
    public bool No_point_of_the_ball_is_lower_than_the_step(int seed)
    {
        var random = new CounterRandom(seed, "trust region step", 0);
        var n = 1 + random.Next(5);
        var matrix = new double[n * n];
        var gradient = new double[n];
        for (var i = 0; i < n; i++)
        {
            gradient[i] = random.Next(4) == 0 ? 0 : random.NextDouble() - 0.5;
            for (var j = 0; j <= i; j++) matrix[(i * n) + j] = matrix[(j * n) + i] = (random.NextDouble() - 0.5) * Math.Pow(10, random.Next(3));
        }

        var radius = Math.Pow(10, random.Next(4) - 2);
        var spectrum = Spectrum.Of(matrix);
        var (along, predicted) = TrustRegionStep.Solve(spectrum, spectrum.Coordinates(gradient), radius);
        var step = spectrum.Combine(along);
        var reached = Model(matrix, gradient, step);
        if (TrustRegionStep.Length(step) > radius * (1 + 1e-5)) return false;
        if (Math.Abs(predicted + reached) > 1e-9 * (1 + Math.Abs(reached))) return false;
        for (var trial = 0; trial < 100; trial++)
        {
            var p = Enumerable.Range(0, n).Select(_ => random.NextDouble() - 0.5).ToArray();
            var size = radius * Math.Sqrt(random.NextDouble()) / TrustRegionStep.Length(p);
            for (var i = 0; i < n; i++) p[i] *= size;
            if (Model(matrix, gradient, p) < reached - (1e-5 * (1 + Math.Abs(reached)))) return false;
        }

        return true;
    }

    [Fact]
    public void Without_a_gradient_the_step_follows_negative_curvature_to_the_edge()
    {
        var spectrum = Spectrum.Of([1, 0, 0, -2]);
        var (along, predicted) = TrustRegionStep.Solve(spectrum, [0, 0], 3);
        var step = spectrum.Combine(along);
        Assert.Equal(0, step[0], 12);
        Assert.Equal(3, Math.Abs(step[1]), 12);
        Assert.Equal(9, predicted, 10);
    }

    private static double Model(double[] matrix, double[] gradient, double[] p)
    {
        var n = p.Length;
        var sum = 0.0;
        for (var i = 0; i < n; i++)
        {
            sum += gradient[i] * p[i];
            for (var j = 0; j < n; j++) sum += 0.5 * p[i] * matrix[(i * n) + j] * p[j];
        }

        return sum;
    }
}
