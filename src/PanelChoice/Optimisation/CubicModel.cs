using PanelChoice.Numerics;

namespace PanelChoice.Optimisation;

/// <summary>A function to third order around a point: g'd + d'Bd/2 + T(d, d, d)/6.</summary>
/// <param name="gradient">g: n first derivatives at the point.</param>
/// <param name="hessian">B: n x n second derivatives there, row by row.</param>
/// <param name="third">n x n x n third derivatives, symmetric.</param>
/// <param name="factor">What the third derivatives are multiplied by to give T.</param>
internal sealed class CubicModel(double[] gradient, double[] hessian, double[] third, double factor)
{
    private const int MostSteps = 20;
    private readonly int n = gradient.Length;

    /// <summary>n first derivatives at the point.</summary>
    public double[] Gradient => gradient;

    /// <summary>The second derivatives at a distance d: B + T(d).</summary>
    public double[] HessianAt(ReadOnlySpan<double> d)
    {
        var sum = (double[])hessian.Clone();
        AddThird(d, 1, sum);
        return sum;
    }

    /// <summary>Adds a multiple of T(d), n x n.</summary>
    public void AddThird(ReadOnlySpan<double> d, double multiple, double[] sum)
    {
        for (var k = 0; k < n; k++)
        {
            var weight = multiple * factor * d[k];
            var slice = third.AsSpan(k * n * n, n * n);
            for (var i = 0; i < slice.Length; i++) sum[i] += weight * slice[i];
        }
    }

    /// <summary>Where the function to third order has its minimum near the point, by Newton steps; null where they find none.</summary>
    public double[]? Minimiser()
    {
        var d = new double[n];
        for (var step = 0; step < MostSteps; step++)
        {
            // The gradient is g + (B + T(d)/2) d.
            var half = (double[])hessian.Clone();
            AddThird(d, 0.5, half);
            var p = SymmetricProduct.Of(half, d);
            for (var i = 0; i < n; i++) p[i] = -gradient[i] - p[i];
            if (ScaledCholesky.Factor(HessianAt(d), n, out _) is not { } factored) return null;
            factored.Solve(p);
            var longest = 0.0;
            for (var i = 0; i < n; i++)
            {
                d[i] += p[i];
                longest = Math.Max(longest, Math.Abs(p[i]));
            }

            if (!double.IsFinite(longest)) return null;
            if (longest < 1e-10) return d;
        }

        return null;
    }
}
