using System.Collections.Immutable;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Optimisation;

namespace PanelChoice.Estimation;

/// <summary>
/// Full-information maximum likelihood under linear restrictions. The search runs in the null space of the restrictions: phi = phi_0 + N z, N an orthonormal basis of what
/// R phi = 0 leaves free, so that values, equalities and ratios of dissimilarities are all one case and every Newton step is exact. Inside, phi is scaled by the
/// roots of its information at the estimate: a step of 1 is about a standard error.
/// </summary>
/// <param name="model">The fitted model; it must be at an interior maximum.</param>
/// <param name="cancellation">Stops between evaluations.</param>
internal sealed class RestrictedRefitter(FittedModel model, CancellationToken cancellation) : IRestrictedRefitter
{
    /// <summary>On larger samples, where a pass takes more than some milliseconds, only maxima known from the unrestricted fit are starts besides the estimate.</summary>
    private const int ManySituations = 50_000;

    /// <summary>A search this near to a maximum found before, in standard errors, is the same.</summary>
    private const double SameMaximum = 0.05;

    /// <summary>Curvature along a direction, as a share of that at the estimate, below which the likelihood is flat or still rising there.</summary>
    private const double Flat = 1e-8;

    /// <summary>Common dissimilarities to start from besides the estimate.</summary>
    private static readonly double[] Common = [1, 0.5, 0.15];

    private static readonly MinimisationSettings Exact = new(Tolerance: 1e-8, MaxIterations: 100);

    private readonly ImmutableArray<int> free = model.Layout.Free;
    private readonly double[] weight = model.Design.PersonWeight.ToArray();
    private readonly double unit = MinusLogLikelihood.MeanWeight(model.Design, model.Design.PersonWeight.ToArray());
    private readonly Lazy<double[]> scales = new(() => ScalesOf(model));

    /// <inheritdoc/>
    public double LogLikelihood => model.LogLikelihood;

    /// <inheritdoc/>
    public RestrictedFit Fit(LinearRestriction restriction)
    {
        var space = new Space(restriction, scales.Value);
        var found = new List<(Minimum Minimum, double[] Origin)>();
        (Minimum Minimum, double[] Origin)? failed = null;
        foreach (var start in Starts(space))
        {
            var origin = space.Project(start);
            var end = Search(space, origin, found);
            if (end is null) continue;
            if (Failure(end, space, origin) is null) found.Add((end, origin));
            else if (failed is null || end.Value < failed.Value.Minimum.Value) failed = (end, origin);
        }

        // An end that is no maximum and yet higher than all maxima is the truth about the restricted likelihood.
        var best = found.Count == 0 ? failed!.Value : found.MinBy(f => f.Minimum.Value);
        if (failed is { } higher && higher.Minimum.Value < best.Minimum.Value - 1e-6) best = higher;
        return Outcome(best.Minimum, space, best.Origin);
    }

    /// <inheritdoc/>
    public RestrictedFit FitNear(LinearRestriction restriction, ReadOnlySpan<double> near)
    {
        var space = new Space(restriction, scales.Value);
        var origin = space.Project(Coordinates(near));
        return Outcome(Search(space, origin, [])!, space, origin);
    }

    /// <inheritdoc/>
    public PointScores At(ReadOnlySpan<double> parameters)
    {
        var layout = model.Layout;
        var design = model.Design;
        var f = free.Length;
        var sums = model.Likelihood.SumScores(parameters, weight);
        var at = model.Likelihood.Evaluate(parameters, weight, Derivatives.Hessian);
        var slope = Slopes(parameters);
        var byCluster = new double[design.Clusters.Length * f];
        for (var p = 0; p < design.Persons; p++)
            for (var i = 0; i < f; i++) byCluster[(design.ClusterOf[p] * f) + i] += slope[i] * sums.ByPerson[(p * layout.Count) + free[i]];
        var information = new double[f * f];
        for (var i = 0; i < f; i++)
        {
            for (var j = 0; j < f; j++) information[(i * f) + j] = -at.Hessian[(free[i] * layout.Count) + free[j]] * slope[i] * slope[j];
            if (IsDissimilarity(i)) information[(i * f) + i] -= slope[i] * at.Gradient[free[i]];
        }

        return new PointScores(byCluster, information);
    }

    /// <summary>Starts in scaled coordinates: the estimate, other maxima of the unrestricted likelihood, and common dissimilarities.</summary>
    private IEnumerable<double[]> Starts(Space space)
    {
        var estimate = Coordinates(model.Parameters.AsSpan());
        yield return Nearest(space, estimate);
        foreach (var optimum in model.Optima.Skip(1)) yield return Coordinates(optimum.Parameters.AsSpan());
        if (model.Design.Situations > ManySituations || !Enumerable.Range(0, free.Length).Any(i => IsDissimilarity(i) && space.Moves(i))) yield break;
        foreach (var l in Common)
        {
            var from = (double[])estimate.Clone();
            for (var i = 0; i < free.Length; i++)
                if (IsDissimilarity(i)) from[i] = Math.Log(l) * scales.Value[i];
            yield return from;
        }
    }

    /// <summary>The point of the restricted space nearest to the estimate in the metric of its information: to first order the restricted maximum itself.</summary>
    private double[] Nearest(Space space, double[] estimate)
    {
        var at = Evaluate(estimate);
        var f = free.Length;
        var information = Matrix<double>.Build.DenseOfRowMajor(f, f, at.Hessian);
        var across = information.Solve(space.Restriction.Transpose());
        var gap = (space.Restriction * Vector<double>.Build.Dense(estimate)) - space.Values;
        var step = across * (space.Restriction * across).Solve(gap);
        var point = new double[f];
        for (var i = 0; i < f; i++) point[i] = estimate[i] - step[i];
        return Array.TrueForAll(point, double.IsFinite) ? point : estimate;
    }

    /// <summary>Runs one search; null when it joins a maximum found before.</summary>
    private Minimum? Search(Space space, double[] origin, List<(Minimum Minimum, double[] Origin)> found)
    {
        var joined = false;
        var minimum = TrustRegionNewton.Minimise(
            z =>
            {
                cancellation.ThrowIfCancellationRequested();
                return space.Reduce(Evaluate(space.Point(origin, z)));
            },
            new double[space.Dimension], Exact,
            at =>
            {
                var x = space.Point(origin, at.Point);
                joined = found.Any(k => Distance(x, space.Point(k.Origin, k.Minimum.Point)) < SameMaximum);
                return joined || IsOutside(x);
            });
        return joined ? null : minimum;
    }

    private static double Distance(double[] a, double[] b)
    {
        var sum = 0.0;
        for (var i = 0; i < a.Length; i++) sum += (a[i] - b[i]) * (a[i] - b[i]);
        return Math.Sqrt(sum);
    }

    private bool IsOutside(double[] x) => Enumerable.Range(0, x.Length).Any(
        i => IsDissimilarity(i) && Math.Exp(x[i] / scales.Value[i]) is < LocalSearch.NearZero or > LocalSearch.VeryLarge);

    private RestrictedFit Outcome(Minimum minimum, Space space, double[] origin) => new(
        [.. Parameters(space.Point(origin, minimum.Point))], -minimum.Value * unit, Failure(minimum, space, origin));

    private string? Failure(Minimum minimum, Space space, double[] origin)
    {
        if (IsOutside(space.Point(origin, minimum.Point))) return "With the restrictions in force a dissimilarity runs to the edge of its range, so there is no interior maximum to test at.";
        if (!minimum.IsMinimum) return "With the restrictions in force the search stopped before a maximum.";
        return space.Dimension > 0 && Spectrum.Of(minimum.At.Hessian).Values[0] < Flat
            ? "With the restrictions in force some terms cannot be told apart, or the likelihood rises without end."
            : null;
    }

    /// <summary>Minus the log-likelihood over the mean weight, by the scaled coordinates.</summary>
    private SmoothValue Evaluate(double[] x)
    {
        var parameters = Parameters(x);
        var at = model.Likelihood.Evaluate(parameters, weight, Derivatives.Hessian);
        var f = free.Length;
        var k = model.Layout.Count;
        var slope = Slopes(parameters);
        var s = scales.Value;
        var gradient = new double[f];
        var hessian = new double[f * f];
        for (var i = 0; i < f; i++)
        {
            gradient[i] = -at.Gradient[free[i]] * slope[i] / (s[i] * unit);
            for (var j = 0; j < f; j++) hessian[(i * f) + j] = -at.Hessian[(free[i] * k) + free[j]] * slope[i] * slope[j] / (s[i] * s[j] * unit);
            if (IsDissimilarity(i)) hessian[(i * f) + i] += gradient[i] / s[i];
        }

        return new SmoothValue(-at.Value / unit, gradient, hessian);
    }

    private double[] Parameters(double[] x)
    {
        var parameters = model.Parameters.ToArray();
        for (var i = 0; i < free.Length; i++) parameters[free[i]] = IsDissimilarity(i) ? Math.Exp(x[i] / scales.Value[i]) : x[i] / scales.Value[i];
        return parameters;
    }

    private double[] Coordinates(ReadOnlySpan<double> parameters)
    {
        var x = new double[free.Length];
        for (var i = 0; i < x.Length; i++) x[i] = (IsDissimilarity(i) ? Math.Log(parameters[free[i]]) : parameters[free[i]]) * scales.Value[i];
        return x;
    }

    /// <summary>Derivative of each free parameter by phi: 1, or the dissimilarity itself.</summary>
    private double[] Slopes(ReadOnlySpan<double> parameters)
    {
        var slope = new double[free.Length];
        for (var i = 0; i < slope.Length; i++) slope[i] = IsDissimilarity(i) ? parameters[free[i]] : 1;
        return slope;
    }

    private bool IsDissimilarity(int i) => free[i] >= model.Layout.Coefficients;

    private static double[] ScalesOf(FittedModel model)
    {
        var unit = MinusLogLikelihood.MeanWeight(model.Design, model.Design.PersonWeight.ToArray());
        return
        [
            .. model.Layout.Free.Select(k =>
            {
                var slope = model.Layout.Parameters[k].Kind == ParameterKind.Dissimilarity ? model.Parameters[k] : 1;
                var curvature = -model.Hessian[(k * model.Layout.Count) + k] * slope * slope / unit;
                return curvature > 0 ? Math.Sqrt(curvature) : 1;
            }),
        ];
    }

    /// <summary>The restrictions in scaled coordinates, and a basis of what they leave free.</summary>
    private sealed class Space
    {
        private readonly double[,] basis;
        private readonly Matrix<double> inverse;

        public Space(LinearRestriction restriction, double[] scales)
        {
            var f = scales.Length;
            var q = restriction.Count;
            Restriction = Matrix<double>.Build.Dense(q, f, (r, c) => restriction.Matrix[(r * f) + c] / scales[c]);
            Values = Vector<double>.Build.Dense([.. restriction.Values]);
            // Rows of length 1: units of the restrictions then matter to nothing.
            for (var r = 0; r < q; r++)
            {
                var length = Restriction.Row(r).L2Norm();
                Restriction.SetRow(r, Restriction.Row(r) / length);
                Values[r] /= length;
            }

            var directions = Restriction.Svd().VT;
            basis = new double[f, f - q];
            for (var i = 0; i < f; i++)
                for (var c = 0; c < f - q; c++) basis[i, c] = directions[q + c, i];
            inverse = Restriction.PseudoInverse();
        }

        public Matrix<double> Restriction { get; }

        public Vector<double> Values { get; }

        /// <summary>Number of free directions.</summary>
        public int Dimension => basis.GetLength(1);

        /// <summary>Whether a coordinate can move.</summary>
        public bool Moves(int i) => Enumerable.Range(0, Dimension).Any(c => Math.Abs(basis[i, c]) > 1e-12);

        /// <summary>The point of the restricted space nearest to another.</summary>
        public double[] Project(double[] x)
        {
            var from = Vector<double>.Build.Dense(x);
            return [.. from - (inverse * ((Restriction * from) - Values))];
        }

        /// <summary>origin + N z.</summary>
        public double[] Point(double[] origin, ReadOnlySpan<double> z)
        {
            var x = (double[])origin.Clone();
            for (var i = 0; i < x.Length; i++)
                for (var c = 0; c < z.Length; c++) x[i] += basis[i, c] * z[c];
            return x;
        }

        /// <summary>A function's derivatives by z: N' g and N' H N.</summary>
        public SmoothValue Reduce(SmoothValue at)
        {
            var (f, n) = (basis.GetLength(0), Dimension);
            var gradient = new double[n];
            var half = new double[f, n];
            var hessian = new double[n * n];
            for (var c = 0; c < n; c++)
                for (var i = 0; i < f; i++)
                {
                    gradient[c] += basis[i, c] * at.Gradient[i];
                    for (var j = 0; j < f; j++) half[i, c] += at.Hessian[(i * f) + j] * basis[j, c];
                }

            for (var r = 0; r < n; r++)
                for (var c = 0; c <= r; c++)
                {
                    for (var i = 0; i < f; i++) hessian[(r * n) + c] += basis[i, r] * half[i, c];
                    hessian[(c * n) + r] = hessian[(r * n) + c];
                }

            return new SmoothValue(at.Value, gradient, hessian);
        }
    }
}
