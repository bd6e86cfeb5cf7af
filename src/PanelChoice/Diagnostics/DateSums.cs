using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// Sums over the persons of each date, for the date score and for deviations from a date's mean. The date score is the sum over all
/// unordered pairs of persons n, m of one date of g_n'g_m, so that no order of persons enters. Given both pasts the two choices are
/// independent under the null, which gives (Omega, E as in <see cref="SituationScores"/>; A_ss = identity in the basis)
/// <code>
/// m     = sum of pairs g_n'g_m                       = (|sum g|^2 - sum |g|^2) / 2
/// A_mm  = sum of pairs tr(Omega_n Omega_m)           = (|sum Omega|^2 - sum |Omega|^2) / 2
/// A_ms  = sum of pairs (E_n'g_m + E_m'g_n)           = (sum E)'(sum g) - sum E'g          minus the mean derivative of m, both ways
/// b     = sum of pairs tr(E_n E_m')                  = (|sum E|^2 - sum |E|^2) / 2
/// </code>
/// with |.| the Euclidean (Frobenius) norm: every date costs as much as it has persons, never as many pairs.
/// </summary>
internal sealed class DateSums
{
    private readonly int[] dateOf;
    private readonly int[] count;
    private readonly double[][] residual;
    private readonly double[][] cross;
    private readonly double[][] probability;

    private DateSums(int[] dateOf, int dates, MomentSums sums)
    {
        this.dateOf = dateOf;
        count = new int[dates];
        residual = new double[dates][];
        cross = new double[dates][];
        probability = new double[dates][];
        Sums = sums;
    }

    /// <summary>The date score's sums: one moment.</summary>
    public MomentSums Sums { get; private set; }

    /// <summary>Number of dates with two or more persons.</summary>
    public int SharedDates => count.Count(c => c > 1);

    /// <summary>Sums a design by date.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">The form.</param>
    /// <param name="parameters">All parameters.</param>
    /// <param name="basis">The whitening basis at these parameters.</param>
    /// <param name="dates">Date of each situation: any numbers that are equal for the same day.</param>
    /// <param name="threads">Threads; no figure depends on it.</param>
    public static DateSums Sum(
        ChoiceDesign design, NestedLogitForm form, ImmutableArray<double> parameters, double[] basis, ImmutableArray<long> dates, int threads)
    {
        var byDate = Enumerable.Range(0, design.Situations).GroupBy(t => dates[t]).OrderBy(d => d.Key).Select(d => d.ToArray()).ToArray();
        var dateOf = new int[design.Situations];
        for (var d = 0; d < byDate.Length; d++)
            foreach (var t in byDate[d]) dateOf[t] = d;
        var result = new DateSums(dateOf, byDate.Length, new MomentSums(1, design.Layout.Free.Length));
        var parts = new MomentSums[FixedChunks.Count(byDate.Length)];
        FixedChunks.Run(byDate.Length, threads, (chunk, first, end) =>
        {
            var scores = new SituationScores(design, form, parameters.AsSpan(), basis);
            var sums = new MomentSums(1, scores.K);
            for (var d = first; d < end; d++) result.AddDate(d, byDate[d], scores, sums);
            parts[chunk] = sums;
        });

        foreach (var part in parts) result.Sums.Add(part);
        return result;
    }

    /// <summary>Takes the date's mean over persons off a residual, its E and its prediction.</summary>
    public void Demean(int situation, Span<double> g, Span<double> e, Span<double> p)
    {
        var d = dateOf[situation];
        Subtract(g, residual[d], count[d]);
        Subtract(e, cross[d], count[d]);
        Subtract(p, probability[d], count[d]);
    }

    private void AddDate(int date, int[] situations, SituationScores scores, MomentSums sums)
    {
        var (J, K) = (scores.J, scores.K);
        double[] g = new double[J], p = new double[J], e = new double[J * K], omega = new double[J * J];
        double residualSquares = 0, omegaSquares = 0, crossSquares = 0;
        var own = new double[K];
        foreach (var t in situations)
        {
            scores.Load(t);
            for (var j = 0; j < J; j++)
            {
                g[j] += scores.Residual[j];
                p[j] += scores.Probability[j];
                residualSquares += scores.Residual[j] * scores.Residual[j];
                for (var k = 0; k < J; k++)
                {
                    omega[(j * J) + k] += scores.OmegaAt(j, k);
                    omegaSquares += scores.OmegaAt(j, k) * scores.OmegaAt(j, k);
                }

                for (var k = 0; k < K; k++)
                {
                    var cell = scores.Cross[(j * K) + k];
                    e[(j * K) + k] += cell;
                    crossSquares += cell * cell;
                    own[k] += cell * scores.Residual[j];
                }
            }
        }

        (count[date], residual[date], cross[date], probability[date]) = (situations.Length, g, e, p);
        if (situations.Length < 2) return;
        sums.Pairs[0]++;
        sums.Moment[0] += (Squares(g) - residualSquares) / 2;
        sums.Variance[0] += (Squares(omega) - omegaSquares) / 2;
        sums.Bias[0] += (Squares(e) - crossSquares) / 2;
        for (var k = 0; k < K; k++)
        {
            var all = 0.0;
            for (var j = 0; j < J; j++) all += e[(j * K) + k] * g[j];
            sums.WithScores[k] += all - own[k];
        }
    }

    private static double Squares(double[] x)
    {
        var sum = 0.0;
        foreach (var value in x) sum += value * value;
        return sum;
    }

    private static void Subtract(Span<double> from, double[] sum, int count)
    {
        for (var k = 0; k < sum.Length; k++) from[k] -= sum[k] / count;
    }
}
