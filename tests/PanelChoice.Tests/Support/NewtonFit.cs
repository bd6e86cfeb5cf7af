using System.Collections.Immutable;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Study;

namespace PanelChoice.Tests.Support;

/// <summary>
/// A bare damped Newton ascent for simulated panels, started at the truth: no multi-start, no identification checks, so that hundreds of
/// panels fit in a test run. A panel without a regular maximum comes back as stopped.
/// </summary>
internal static class NewtonFit
{
    private const int MostIterations = 60;

    public static FittedModel From(ChoiceDesign design, NestedLogitForm form, ImmutableArray<double> start)
    {
        var likelihood = LikelihoodKernel.Create(design, form, 1);
        var weight = design.PersonWeight.ToArray();
        var free = design.Layout.Free;
        var theta = start.ToArray();
        var here = likelihood.Evaluate(theta, weight, Derivatives.Hessian);
        var status = FitStatus.Stopped;
        var iteration = 0;
        for (; iteration < MostIterations && status == FitStatus.Stopped; iteration++)
        {
            var gradient = Vector<double>.Build.Dense(free.Length, k => here.Gradient[free[k]]);
            var information = Matrix<double>.Build.Dense(free.Length, free.Length, (r, c) => -here.Hessian[(free[r] * theta.Length) + free[c]]);
            var step = Step(information, gradient);
            if (gradient * step < 1e-12) { status = FitStatus.Converged; break; }

            var length = 1.0;
            double[] next;
            LikelihoodEvaluation there;
            do
            {
                next = (double[])theta.Clone();
                for (var k = 0; k < free.Length; k++) next[free[k]] += length * step[k];
                length /= 2;
                var inside = Enumerable.Range(design.Layout.Coefficients, theta.Length - design.Layout.Coefficients).All(k => next[k] is > 0.05 and < 5);
                there = inside ? likelihood.Evaluate(next, weight, Derivatives.Hessian) : new LikelihoodEvaluation(double.NegativeInfinity, [], []);
            }
            while (!(there.Value > here.Value) && length > 1e-6);
            if (!(there.Value > here.Value))
            {
                // In a large panel rounding of the log-likelihood hides the last steps; they move no estimate by a thousandth of its error.
                if (gradient * step < 1e-6) status = FitStatus.Converged;
                break;
            }

            (theta, here) = (next, there);
        }

        if (theta.Take(design.Layout.Coefficients).Any(b => Math.Abs(b) > 8)) status = FitStatus.Stopped;
        return new FittedModel(
            likelihood, form, status, [.. theta], here.Value, double.NaN, null, here.Hessian, double.NaN, iteration, 1,
            status == FitStatus.Converged ? 1 : 0, [], []);
    }

    /// <summary>The Newton step; where the information is not positive definite a multiple of its diagonal is added until it is.</summary>
    private static Vector<double> Step(Matrix<double> information, Vector<double> gradient)
    {
        var scale = information.Diagonal().Select(Math.Abs).Max();
        for (var ridge = 0.0; ; ridge = ridge == 0 ? 1e-4 * scale : ridge * 10)
        {
            var shifted = information + Matrix<double>.Build.DenseDiagonal(gradient.Count, gradient.Count, ridge);
            if (shifted.Evd(Symmetricity.Symmetric).EigenValues.All(e => e.Real > 1e-8 * scale)) return shifted.Solve(gradient);
        }
    }
}
