using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>
/// The score statistic at a restricted maximum and its distribution under multipliers w (Kline and Santos 2012, in the form that estimates under the null only once):
/// <code>
/// a_g = R H^-1 s_g      T(w) = (sum w_g a_g)' (sum w_g^2 a_g a_g')^-1 (sum w_g a_g)      T = T(1)      p = share of w with T(w) >= T
/// </code>
/// s_g are scores of cluster g and H minus the Hessian, both at the restricted maximum.
/// </summary>
internal sealed class ScoreStatistic
{
    /// <summary>Statistics that differ by less than this share are equal: sets of signs that mirror each other come out so in all but their last bits.</summary>
    private const double Rounding = 1e-9;

    private readonly double[] a;
    private readonly double[] solved;
    private readonly int clusters;
    private readonly int q;

    private ScoreStatistic(double[] a, double[] solved, int clusters, int q)
    {
        this.a = a;
        this.solved = solved;
        this.clusters = clusters;
        this.q = q;
        var sum = new double[q];
        var other = new double[q];
        for (var g = 0; g < clusters; g++)
            for (var i = 0; i < q; i++)
            {
                sum[i] += a[(g * q) + i];
                other[i] += solved[(g * q) + i];
            }

        for (var i = 0; i < q; i++) Value += sum[i] * other[i];
    }

    /// <summary>T.</summary>
    public double Value { get; }

    /// <summary>The statistic; null when the contributions of clusters do not span all restrictions.</summary>
    /// <param name="matrix">R, q x F.</param>
    /// <param name="information">H as a factor, F x F.</param>
    /// <param name="byCluster">Scores of clusters, G x F.</param>
    /// <param name="f">F.</param>
    public static ScoreStatistic? Of(ReadOnlySpan<double> matrix, ScaledCholesky information, double[] byCluster, int f)
    {
        var q = matrix.Length / f;
        var clusters = byCluster.Length / f;
        var a = new double[clusters * q];
        for (var i = 0; i < q; i++)
        {
            var row = matrix.Slice(i * f, f).ToArray();
            information.Solve(row);
            for (var g = 0; g < clusters; g++)
                for (var c = 0; c < f; c++) a[(g * q) + i] += row[c] * byCluster[(g * f) + c];
        }

        var meat = Meat(a, clusters, q, null);
        if (ScaledCholesky.Factor(meat, q, out _) is not { } factor) return null;
        var solved = (double[])a.Clone();
        for (var g = 0; g < clusters; g++) factor.Solve(solved.AsSpan(g * q, q));
        return new ScoreStatistic(a, solved, clusters, q);
    }

    /// <summary>The p-value and its Monte-Carlo error, 0 where all sets were gone through. A drawn one counts the sample itself as a draw, so that it is never 0.</summary>
    /// <param name="multipliers">The sets.</param>
    /// <param name="threads">Threads; no bit depends on it.</param>
    public (double P, double Error) PValue(ScoreMultipliers multipliers, int threads)
    {
        var hits = new long[FixedChunks.Count(multipliers.Sets)];
        var isSigns = multipliers.Weights == ScoreWeights.Rademacher;
        FixedChunks.Run(multipliers.Sets, threads, (chunk, first, end) =>
        {
            var w = new double[clusters];
            for (var set = first; set < end; set++)
            {
                multipliers.Fill(set, w);
                var t = isSigns ? UnderSigns(w) : Under(w);
                if (t >= Value * (1 - Rounding)) hits[chunk]++;
            }
        });
        var total = hits.Sum();
        if (multipliers.IsEnumerated) return ((double)total / multipliers.Sets, 0);
        var p = (1.0 + total) / (1.0 + multipliers.Sets);
        return (p, Math.Sqrt(p * (1 - p) / multipliers.Sets));
    }

    /// <summary>T(w) for signs, which leave the matrix in the middle as it is.</summary>
    private double UnderSigns(double[] w)
    {
        var t = 0.0;
        for (var i = 0; i < q; i++)
        {
            double left = 0, right = 0;
            for (var g = 0; g < clusters; g++)
            {
                left += w[g] * a[(g * q) + i];
                right += w[g] * solved[(g * q) + i];
            }

            t += left * right;
        }

        return t;
    }

    private double Under(double[] w)
    {
        var sum = new double[q];
        for (var g = 0; g < clusters; g++)
            for (var i = 0; i < q; i++) sum[i] += w[g] * a[(g * q) + i];
        // Multipliers are never 0, so that what could be factored before can be now.
        var factor = ScaledCholesky.Factor(Meat(a, clusters, q, w), q, out _)!;
        var right = (double[])sum.Clone();
        factor.Solve(right);
        var t = 0.0;
        for (var i = 0; i < q; i++) t += sum[i] * right[i];
        return t;
    }

    private static double[] Meat(double[] a, int clusters, int q, double[]? w)
    {
        var meat = new double[q * q];
        for (var g = 0; g < clusters; g++)
            for (var i = 0; i < q; i++)
                for (var j = 0; j < q; j++) meat[(i * q) + j] += (w is null ? 1 : w[g] * w[g]) * a[(g * q) + i] * a[(g * q) + j];
        return meat;
    }
}
