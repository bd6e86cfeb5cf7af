using System.Numerics.Tensors;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Optimisation;

namespace PanelChoice.Estimation;

/// <summary>
/// One replicate's way from the full estimate to its own maximum, a gradient at a time. The first step is that of the log-likelihood to third order, and
/// needs no data. After it the Hessian at any point is the replicate's own at the full estimate, carried there by the third derivatives, and corrected by what
/// the gradients on the way have shown (BFGS updates, Nocedal and Wright 2006, 6.1).
/// <para>
/// The certificate. With e the distance from the maximum where the last gradient g was taken and M the Hessian used there, the step leaves
/// e' = (I - M^-1 H) e, H the mean Hessian between that point and the maximum. In the norm of M, with k a bound on |M^-1/2 H M^-1/2 - I|:
/// |e| is at most d / (1 - k), d = sqrt(g' M^-1 g) the Newton decrement, and |e'| at most k d / (1 - k). Two things tell how large k may be. A step s on the
/// way changed the gradient by y, and |y - M s| / |s| in that norm is the error of M along s: seen along one of n directions, an error has about
/// sqrt(n) times that norm. From the full estimate, where M is exact, to the end of a step the error grows in proportion or faster, so that its mean is half
/// (third derivatives off) or a third (fourth derivatives missing) of its value at the end: the first step counts three times. And where third derivatives
/// change the Hessian by a share t of itself, fourth derivatives may change it by a share of the order of t^2. Where the sample's Hessian stands for the
/// replicate's, M is not exact at the full estimate either, and a step may miss the one direction in which it is wrong: there the size of that error comes in,
/// as the clusters' Hessians let it be expected (<see cref="ReplicateStart"/>). k is the sum of all, and the bound is doubled for what none sees.
/// </para>
/// </summary>
internal sealed class ReplicateSearch
{
    /// <summary>Passes after which a search that has not settled is left to exact Newton steps.</summary>
    private const int MostPasses = 12;

    /// <summary>Longest way from the full estimate, in utilities for a column's standard deviation.</summary>
    private const double LongestWay = 5;

    /// <summary>The error of the Hessian, as a share of it, with which a step may be the last.</summary>
    private const double MostError = 0.8;

    /// <summary>The error of a Hessian that no step was long enough to test: the bound is then about 2.4 decrements.</summary>
    private const double Untold = 0.5;

    /// <summary>Condition of the scaled Hessian above which exact Newton steps have to judge whether every parameter is identified.</summary>
    private const double MostCondition = 1e6;

    /// <summary>Rounding of a gradient, in standard errors (measured 1e-13 to 1e-12): no certificate is below it.</summary>
    private const double Rounding = 1e-12;

    private readonly MinusLogLikelihood function;
    private readonly CubicModel model;
    private readonly double[] personWeight;
    private readonly double tolerance;
    private readonly double clones;
    private readonly double borrowed;
    private readonly double[] from;
    private readonly List<double[]> points;
    private readonly List<double[]> gradients;
    private double[] x;
    private int passes;
    private double shortest = double.PositiveInfinity;

    /// <summary>Starts a search.</summary>
    /// <param name="function">Minus the replicate's log-likelihood, over the parameters that move.</param>
    /// <param name="estimate">The full estimate, all K parameters.</param>
    /// <param name="model">The function to third order around it.</param>
    /// <param name="personWeight">The replicate's weights.</param>
    /// <param name="clones">By how much its pooled standard errors are smaller than they are in the function's units.</param>
    /// <param name="borrowed">Error of the model's Hessian at the full estimate as a share of it: 0 where it is the replicate's own.</param>
    /// <param name="tolerance">Distance from the maximum, in those standard errors, at which to stop.</param>
    public ReplicateSearch(
        MinusLogLikelihood function, ReadOnlySpan<double> estimate, CubicModel model, double[] personWeight, double clones, double borrowed, double tolerance)
    {
        this.function = function;
        this.model = model;
        this.personWeight = personWeight;
        this.clones = clones;
        this.borrowed = borrowed;
        this.tolerance = tolerance;
        from = x = function.Coordinates(estimate);
        points = [from];
        gradients = [model.Gradient];
        if (model.Minimiser() is { } step) Move(step);
    }

    /// <summary>Where the likelihood is wanted next; null when the search has ended.</summary>
    public WeightedPoint? Next { get; private set; }

    /// <summary>The refit; null where the search ended without one, so that exact Newton steps have to find out.</summary>
    public RefitOutcome? Outcome { get; private set; }

    private int Count => from.Length;

    /// <summary>Takes the likelihood with its gradient at the point asked for, and goes on or ends.</summary>
    public void Take(LikelihoodEvaluation at)
    {
        var parameters = Next!.Parameters;
        Next = null;
        passes++;
        var gradient = function.GradientInCoordinates(parameters, at);
        if (!double.IsFinite(at.Value) || !Array.TrueForAll(gradient, double.IsFinite)) return;
        points.Add(x);
        gradients.Add(gradient);
        if (CorrectedHessian(out var error) is not { } hessian || ScaledCholesky.Factor(hessian, Count, out _) is not { } factor) return;

        double[] step = [.. gradient.Select(g => -g)];
        factor.Solve(step);
        var decrement = Math.Sqrt(Math.Max(0, -TensorPrimitives.Dot(step, gradient)));
        if (!double.IsFinite(decrement) || LooksSeparated(step, decrement)) return;
        if (Certificate(decrement, error) <= tolerance)
        {
            var inverse = factor.Inverse();
            var bound = Certificate(decrement, error + SquaredTurn(inverse));
            if (bound <= tolerance)
            {
                if (IsClearlyInterior(parameters, hessian, inverse)) Settle(step, at.Value + (0.5 * decrement * decrement * function.Unit), bound);
                return;
            }
        }

        // A search that works at least halves the decrement; rounding keeps one that has arrived from doing so.
        if (passes == MostPasses || (passes > 1 && decrement > 0.5 * shortest)) return;
        shortest = Math.Min(shortest, decrement);
        Move(step);
    }

    /// <summary>How far from the maximum, in the replicate's pooled standard errors, the point after the step may be.</summary>
    /// <param name="decrement">The decrement before it.</param>
    /// <param name="error">Error of the Hessian as a share of it.</param>
    private double Certificate(double decrement, double error) =>
        error < MostError ? (2 * clones * error * Math.Sqrt(1 + error) / (1 - error) * decrement) + Rounding : double.PositiveInfinity;

    /// <summary>t^2: squared Frobenius norm of what third derivatives changed in the Hessian since the full estimate, as a share of it.</summary>
    private double SquaredTurn(double[] inverse)
    {
        var turn = new double[Count * Count];
        model.AddThird(Sum(x, from, -1), 1, turn);
        return SymmetricProduct.SquaredShare(turn, inverse, Count);
    }

    private void Move(double[] step)
    {
        x = Sum(x, step, 1);
        if (!(TensorPrimitives.Distance<double>(x, from) <= LongestWay)) return;
        Next = new WeightedPoint(function.Parameters(x), personWeight);
    }

    private void Settle(double[] step, double logLikelihood, double bound)
    {
        x = Sum(x, step, 1);
        Outcome = new RefitOutcome(FitStatus.Converged, [.. function.Parameters(x)], logLikelihood, passes + 1, false, null, []) { Decrement = bound };
    }

    /// <summary>The Hessian at the last point, and a bound on its error as a share of it; null where it is not positive definite on the way.</summary>
    private double[]? CorrectedHessian(out double error)
    {
        var hessian = model.HessianAt(Sum(x, from, -1));
        var isTold = false;
        error = 0;
        for (var i = 1; i < points.Count; i++)
        {
            if (ScaledCholesky.Factor(hessian, Count, out _) is not { } factor) return null;
            var s = Sum(points[i], points[i - 1], -1);
            var y = Sum(gradients[i], gradients[i - 1], -1);
            // y belongs to the middle of the step: the third derivatives carry it to the last point.
            var turn = new double[Count * Count];
            model.AddThird(Sum(x, Sum(points[i], points[i - 1], 1), -0.5), 1, turn);
            y = Sum(y, SymmetricProduct.Of(turn, s), 1);

            var product = SymmetricProduct.Of(hessian, s);
            var curvature = TensorPrimitives.Dot(product, s);
            if (!(curvature > 0)) return null;
            if (Math.Sqrt(curvature) < Rounding * 1e4) continue;
            var missed = Sum(y, product, -1);
            var solved = (double[])missed.Clone();
            factor.Solve(solved);
            var along = Math.Sqrt(Math.Max(0, TensorPrimitives.Dot(solved, missed)) / curvature);
            error = Math.Max(error, (i == 1 ? 3 : 1) * Math.Sqrt(Count) * along);
            isTold = true;
            var seen = TensorPrimitives.Dot(y, s);
            if (!(seen > 0.1 * curvature)) return null;
            for (var r = 0; r < Count; r++)
                for (var c = 0; c < Count; c++)
                    hessian[(r * Count) + c] += (y[r] * y[c] / seen) - (product[r] * product[c] / curvature);
        }

        error = borrowed + (isTold ? error : Untold);
        return hessian;
    }

    /// <summary>Whether the step stays long while the gain it promises vanishes: the mark of a likelihood that rises without end.</summary>
    private static bool LooksSeparated(double[] step, double decrement) =>
        decrement < LocalSearch.SuspectDecrement && step.Max(Math.Abs) >= LocalSearch.SuspectStep;

    /// <summary>Whether nothing about the end asks for a closer look: dissimilarities well inside their range, every parameter well told.</summary>
    private bool IsClearlyInterior(double[] parameters, double[] hessian, double[] inverse)
    {
        var trace = 0.0;
        for (var i = 0; i < Count; i++)
        {
            var curvature = hessian[(i * Count) + i];
            trace += inverse[(i * Count) + i] * curvature;
            if (!function.IsDissimilarity(function.Active[i])) continue;
            if (parameters[function.Active[i]] is < LocalSearch.Small or > LocalSearch.Large || curvature < 10 * LocalSearch.Silent) return false;
        }

        // Scaled to unit diagonal the largest eigenvalue is n at most, and the trace of the inverse bounds the inverse of the smallest.
        return Count * trace <= MostCondition;
    }

    private static double[] Sum(double[] a, double[] b, double factor)
    {
        var sum = new double[a.Length];
        for (var i = 0; i < sum.Length; i++) sum[i] = a[i] + (factor * b[i]);
        return sum;
    }
}
