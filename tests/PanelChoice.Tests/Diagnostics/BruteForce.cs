using MathNet.Numerics.LinearAlgebra;

namespace PanelChoice.Tests.Diagnostics;

/// <summary>
/// The battery's moments by plain double loops over pairs of situations, with explicit A_ss^-1 and no running sums. It shares no code with the
/// library; where the situations come from <see cref="ClosedFormRows"/>, not a single one.
/// </summary>
internal sealed class BruteForce
{
    /// <summary>One situation.</summary>
    /// <param name="Person">Person.</param>
    /// <param name="Position">Place in time.</param>
    /// <param name="Date">Date.</param>
    /// <param name="Chosen">Chosen alternative.</param>
    /// <param name="P">Probability of each alternative.</param>
    /// <param name="F">f^i: derivatives by (V, l) of every hypothetical choice; null where not offered.</param>
    /// <param name="S">Its scores.</param>
    internal sealed record Row(int Person, long Position, long Date, int Chosen, double[] P, double[]?[] F, double[]?[] S);

    private readonly int parameters;

    /// <summary>Sums over rows.</summary>
    /// <param name="rows">Situations, person by person in order.</param>
    public BruteForce(IReadOnlyList<Row> rows)
    {
        Rows = rows;
        J = rows[0].P.Length;
        parameters = rows[0].S.First(s => s is not null)!.Length;
        P = [.. rows.Select(r => r.P)];
        G = [.. rows.Select(r => r.F)];
        S = [.. rows.Select(r => r.S)];
        var k = parameters;
        var a = Matrix<double>.Build.Dense(k, k);
        for (var t = 0; t < rows.Count; t++)
            for (var i = 0; i < J; i++)
                if (S[t][i] is { } s)
                    for (var r = 0; r < k; r++)
                        for (var c = 0; c < k; c++) a[r, c] += P[t][i] * s[r] * s[c];
        Information = a;
        Inverse = a.Inverse();
    }

    public IReadOnlyList<Row> Rows { get; }

    public int J { get; }

    public List<double[]> P { get; }

    /// <summary>f^i: derivatives by (V, l) of every hypothetical choice of every row.</summary>
    public List<double[]?[]> G { get; }

    public List<double[]?[]> S { get; }

    public Matrix<double> Information { get; }

    public Matrix<double> Inverse { get; }

    public double[] Observed(int t) => [.. G[t][Rows[t].Chosen]!.Take(J)];

    public double[] ObservedScore(int t) => S[t][Rows[t].Chosen]!;

    /// <summary>Corrected value, variance and bias of a moment that is a double sum with weights w_j,k(t, s) on g_s,k g_t,j.</summary>
    public (double Raw, double RawVariance, double Bias, double Value, double Variance) Moment(Func<int, int, int, int, double> weight)
    {
        var filters = Enumerable.Range(0, Rows.Count).Select(t =>
        {
            var z = new double[J];
            var ez = Matrix<double>.Build.Dense(J, parameters);
            for (var s = 0; s < Rows.Count; s++)
                for (var j = 0; j < J; j++)
                    for (var k = 0; k < J; k++)
                    {
                        if (weight(t, s, j, k) is var w && w == 0) continue;
                        z[j] += w * Observed(s)[k];
                        for (var q = 0; q < parameters; q++) ez[j, q] += w * Cov(s)[k, q];
                    }

            return (z, ez);
        }).ToList();
        return Moment(filters.Select(f => f.z).ToList(), filters.Select(f => f.ez).ToList());
    }

    /// <summary>The same from z and Ez of each row.</summary>
    public (double Raw, double RawVariance, double Bias, double Value, double Variance) Moment(List<double[]> z, List<Matrix<double>> ez)
    {
        double raw = 0, rawVariance = 0, bias = 0;
        var ams = Vector<double>.Build.Dense(parameters);
        var total = Vector<double>.Build.Dense(parameters);
        for (var t = 0; t < Rows.Count; t++)
        {
            raw += Dot(z[t], Observed(t));
            for (var i = 0; i < J; i++)
            {
                if (G[t][i] is not { } g) continue;
                var u = Dot(z[t], g);
                rawVariance += P[t][i] * u * u;
                for (var q = 0; q < parameters; q++) ams[q] += P[t][i] * u * S[t][i]![q];
            }

            total += Vector<double>.Build.Dense(ObservedScore(t));
            bias += (ez[t] * Inverse * Cov(t).Transpose()).Trace();
        }

        return (raw, rawVariance, bias, raw - (ams * Inverse * total) + bias, rawVariance - (ams * Inverse * ams));
    }

    /// <summary>The information trace: z'f = (A^-1 sum of earlier s)'s.</summary>
    public (double Raw, double RawVariance, double Bias, double Value, double Variance) InformationTrace()
    {
        double raw = 0, rawVariance = 0, bias = 0;
        var ams = Vector<double>.Build.Dense(parameters);
        var total = Vector<double>.Build.Dense(parameters);
        for (var t = 0; t < Rows.Count; t++)
        {
            total += Vector<double>.Build.Dense(ObservedScore(t));
            for (var s = 0; s < t; s++)
            {
                if (Rows[s].Person != Rows[t].Person) continue;
                var left = Inverse * Vector<double>.Build.Dense(ObservedScore(s));
                raw += left * Vector<double>.Build.Dense(ObservedScore(t));
                bias += (InformationOf(t) * Inverse * InformationOf(s) * Inverse).Trace();
                ams += InformationOf(t) * left;
                for (var v = 0; v < t; v++)
                    if (Rows[v].Person == Rows[t].Person)
                        rawVariance += left * InformationOf(t) * (Inverse * Vector<double>.Build.Dense(ObservedScore(v)));
            }
        }

        return (raw, rawVariance, bias, raw - (ams * Inverse * total) + bias, rawVariance - (ams * Inverse * ams));
    }

    /// <summary>
    /// The date score over all unordered pairs of persons of a date; mean, variance and third cumulant from the full matrices A and
    /// Omega - E A_ss^-1 E' over all situations.
    /// </summary>
    public (double Raw, double RawVariance, double Bias, double Value, double Variance, double ThirdCumulant) Date()
    {
        var n = Rows.Count;
        double raw = 0, rawVariance = 0;
        var ams = Vector<double>.Build.Dense(parameters);
        var total = Vector<double>.Build.Dense(parameters);
        var a = Matrix<double>.Build.Dense(n * J, n * J);
        var omega = Matrix<double>.Build.Dense(n * J, n * J);
        var e = Matrix<double>.Build.Dense(n * J, parameters);
        for (var t = 0; t < n; t++)
        {
            total += Vector<double>.Build.Dense(ObservedScore(t));
            omega.SetSubMatrix(t * J, t * J, Omega(t));
            e.SetSubMatrix(t * J, 0, Cov(t));
            for (var s = 0; s < n; s++)
            {
                if (s == t || Rows[s].Date != Rows[t].Date) continue;
                for (var j = 0; j < J; j++) a[(t * J) + j, (s * J) + j] = 1;
                if (s > t) continue;
                raw += Dot(Observed(s), Observed(t));
                rawVariance += (Omega(s) * Omega(t)).Trace();
                ams += (Cov(s).Transpose() * Vector<double>.Build.Dense(Observed(t)))
                    + (Cov(t).Transpose() * Vector<double>.Build.Dense(Observed(s)));
            }
        }

        var fitted = a * (omega - (e * Inverse * e.Transpose()));
        var bias = -fitted.Trace() / 2;
        return (
            raw, rawVariance, bias, raw - (ams * Inverse * total) + bias, (fitted * fitted).Trace() / 2, (fitted * fitted * fitted).Trace());
    }

    /// <summary>Cov(g, s) of a row.</summary>
    public Matrix<double> Cov(int t)
    {
        var e = Matrix<double>.Build.Dense(J, parameters);
        for (var i = 0; i < J; i++)
            if (G[t][i] is { } g)
                for (var j = 0; j < J; j++)
                    for (var q = 0; q < parameters; q++) e[j, q] += P[t][i] * g[j] * S[t][i]![q];
        return e;
    }

    private Matrix<double> Omega(int t)
    {
        var o = Matrix<double>.Build.Dense(J, J);
        for (var i = 0; i < J; i++)
            if (G[t][i] is { } g)
                for (var j = 0; j < J; j++)
                    for (var k = 0; k < J; k++) o[j, k] += P[t][i] * g[j] * g[k];
        return o;
    }

    private Matrix<double> InformationOf(int t)
    {
        var a = Matrix<double>.Build.Dense(parameters, parameters);
        for (var i = 0; i < J; i++)
            if (S[t][i] is { } s) a += P[t][i] * Vector<double>.Build.Dense(s).OuterProduct(Vector<double>.Build.Dense(s));
        return a;
    }

    private static double Dot(double[] left, double[] right)
    {
        var sum = 0.0;
        for (var k = 0; k < left.Length; k++) sum += left[k] * right[k];
        return sum;
    }
}
