using System.Collections.Immutable;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>What the share of each cluster in the information tells of one term.</summary>
/// <param name="Effective">Effective number of clusters, G/(1 + Gamma) (<see cref="ClusterSweep"/>).</param>
/// <param name="Largest">Largest partial leverage, as a share of the term's whole: 1/G if all clusters were alike.</param>
/// <param name="Spread">Coefficient of variation of the partial leverages.</param>
public sealed record TermLeverage(double Effective, double Largest, double Spread);

/// <summary>
/// One pass over the clusters' parts H_g of the information H, with G clusters and F free parameters. With W H W' = I, a cluster is M_g = W H_g W' =
/// Q diag(l) Q', a term c is z = W c, so that c'H^-1 c = z'z.
/// <list type="bullet">
/// <item>Leverage tr(H_g H^-1) = sum l; mean F/G.</item>
/// <item>Partial leverage of a term: c'H^-1 H_g H^-1 c / c'H^-1 c = z'M_g z / z'z; it adds up to 1 (for a linear model MacKinnon, Nielsen and Webb 2023).</item>
/// <item>Effective number of clusters G/(1 + Gamma), Gamma = (1/G) sum ((g_g - mean)/mean)^2 with g_g = c'H^-1 H_g H^-1 c: the form without correlation
/// inside clusters of Carter, Schnepel and Steigerwald (2017), with the information in the place of the moments of regressors.</item>
/// <item>Scores (I - H_g H^-1)^(-1/2) s_g of the bias-reduced covariance and its degrees of freedom (<see cref="BiasReducedCovariance"/>).</item>
/// </list>
/// Nothing of it is kept for each cluster but its leverage; a window of clusters is worked out on all threads and added up in order.
/// </summary>
/// <param name="Leverage">G leverages.</param>
/// <param name="Terms">F terms.</param>
/// <param name="Whitener">W, F x F.</param>
/// <param name="Meat">W sum (adjusted scores) (adjusted scores)' W', F x F; without meaning where some cluster is not positive.</param>
/// <param name="DegreesOfFreedom">F degrees of freedom; NaN where they do not exist.</param>
/// <param name="NotPositive">Clusters without which the information left is not positive definite, with the place of the term that fails.</param>
internal sealed record ClusterSweep(
    double[] Leverage, ImmutableArray<TermLeverage> Terms, double[] Whitener, double[] Meat, double[] DegreesOfFreedom, ImmutableArray<(int Cluster, int Term)> NotPositive)
{
    /// <summary>Doubles of clusters' parts that are in memory at a time: 4 MB.</summary>
    private const int WindowEntries = 1 << 19;

    /// <summary>The pass; null where H is not positive definite.</summary>
    public static ClusterSweep? Over(InferenceInput input, ScoreSums scores, WorkContext work)
    {
        var f = input.Free.Length;
        if (ScaledCholesky.Factor(input.Information.AsSpan(), f, out _)?.Whitener() is not { } whitener) return null;
        var clusters = input.Clusters.Length;
        var pass = new Pass(input, scores, whitener, Math.Clamp(WindowEntries / Math.Max(1, f * f), 1, ClusterJackknife.ClustersAtOnce));
        for (var from = 0; from < clusters; from += pass.Window)
        {
            work.Report("leverage", from, clusters);
            pass.Add(from, Math.Min(pass.Window, clusters - from), work.Threads);
        }

        work.Report("leverage", clusters, clusters);
        return pass.Finish();
    }

    private sealed class Pass
    {
        // Nearer to 1 than this an eigenvalue of M_g leaves no digit in what is divided by its distance.
        private const double Closest = 1e-10;

        private readonly InferenceInput input;
        private readonly ScoreSums scores;
        private readonly double[] whitener;
        private readonly int f;
        private readonly double[] whole;
        private readonly double[] leverage;
        private readonly double[] largest;
        private readonly double[] squares;
        private readonly double[] meat;
        private readonly double[] own;
        private readonly double[] products;
        private readonly List<(int, int)> notPositive = [];

        // Of a window: adjusted scores, shares c'H^-1 H_g H^-1 c, the two parts of P_gg, and the vectors a_g of each term.
        private readonly double[] adjusted, shares, diagonal, lengths, vectors;
        private readonly int[] failed;

        public Pass(InferenceInput input, ScoreSums scores, double[] whitener, int window)
        {
            (this.input, this.scores, this.whitener, Window) = (input, scores, whitener, Math.Min(window, input.Clusters.Length));
            f = input.Free.Length;
            leverage = new double[input.Clusters.Length];
            (largest, squares, own) = (new double[f], new double[f], new double[f]);
            (meat, products) = (new double[f * f], new double[f * f * f]);
            (adjusted, shares, diagonal, lengths) = (new double[Window * f], new double[Window * f], new double[Window * f], new double[Window * f]);
            vectors = new double[Window * f * f];
            failed = new int[Window];
            whole = [.. Enumerable.Range(0, f).Select(k => Enumerable.Range(0, f).Sum(r => whitener[(r * f) + k] * whitener[(r * f) + k]))];
        }

        public int Window { get; }

        public void Add(int from, int count, int threads)
        {
            var parts = input.ClusterInformation(from, count);
            FixedChunks.Run(count, threads, (_, first, end) =>
            {
                for (var i = first; i < end; i++) Look(from + i, i, parts.AsSpan(i * f * f, f * f));
            });
            var mean = 1.0 / input.Clusters.Length;
            for (var i = 0; i < count; i++)
            {
                if (failed[i] >= 0) notPositive.Add((from + i, failed[i]));
                for (var k = 0; k < f; k++)
                {
                    var share = shares[(i * f) + k] / whole[k];
                    largest[k] = Math.Max(largest[k], share);
                    squares[k] += ((share / mean) - 1) * ((share / mean) - 1);
                    var (p, a) = (diagonal[(i * f) + k], lengths[(i * f) + k]);
                    own[k] += (p * p) - (2 * p * a);
                }
            }

            var sum = Sandwich.OuterSum(adjusted.AsMemory(0, count * f), f, threads);
            for (var i = 0; i < meat.Length; i++) meat[i] += sum[i];
            // By term: each has its own sum of a_g a_g', added up in the order of clusters.
            FixedChunks.Run(f, threads, (_, first, end) =>
            {
                for (var k = first; k < end; k++)
                    for (var i = 0; i < count; i++) AddProducts(vectors.AsSpan(((i * f) + k) * f, f), products.AsSpan(k * f * f, f * f));
            });
        }

        public ClusterSweep Finish()
        {
            var clusters = input.Clusters.Length;
            var terms = Enumerable.Range(0, f).Select(k => new TermLeverage(
                clusters / (1 + (squares[k] / clusters)), largest[k], clusters < 2 ? double.NaN : Math.Sqrt(squares[k] / (clusters - 1))));
            var degrees = Enumerable.Range(0, f).Select(k =>
            {
                var pairs = own[k];
                for (var r = 0; r < f; r++)
                    for (var c = 0; c <= r; c++)
                    {
                        var entry = products[(((k * f) + r) * f) + c];
                        pairs += (r == c ? 1 : 2) * entry * entry;
                    }

                // tr P is c'H^-1 c: under its working model the bias-reduced variance is unbiased.
                var nu = whole[k] * whole[k] / pairs;
                return pairs > 0 && double.IsFinite(nu) ? nu : double.NaN;
            });
            return new ClusterSweep(leverage, [.. terms], whitener, meat, [.. degrees], [.. notPositive]);
        }

        private void Look(int cluster, int at, ReadOnlySpan<double> part)
        {
            var (half, own) = (new double[f * f], Matrix<double>.Build.Dense(f, f));
            for (var r = 0; r < f; r++)
                for (var c = 0; c < f; c++)
                    for (var k = 0; k <= r; k++) half[(r * f) + c] += whitener[(r * f) + k] * part[(k * f) + c];
            for (var r = 0; r < f; r++)
                for (var c = 0; c <= r; c++)
                {
                    var sum = 0.0;
                    for (var k = 0; k <= c; k++) sum += half[(r * f) + k] * whitener[(c * f) + k];
                    own[r, c] = own[c, r] = sum;
                }

            leverage[cluster] = own.Trace();
            shares.AsSpan(at * f, f).Clear();
            adjusted.AsSpan(at * f, f).Clear();
            diagonal.AsSpan(at * f, f).Clear();
            lengths.AsSpan(at * f, f).Clear();
            vectors.AsSpan(at * f * f, f * f).Clear();
            failed[at] = -1;
            if (!own.Enumerate().All(double.IsFinite))
            {
                failed[at] = 0;
                return;
            }

            var spectrum = own.Evd(Symmetricity.Symmetric);
            var basis = spectrum.EigenVectors.ToColumnMajorArray();
            var values = spectrum.EigenValues.Real().ToArray();
            // Row i: the terms z in the direction of eigenvector i.
            var turned = new double[f * f];
            for (var i = 0; i < f; i++)
                for (var k = 0; k < f; k++)
                {
                    var sum = 0.0;
                    for (var r = k; r < f; r++) sum += basis[(i * f) + r] * whitener[(r * f) + k];
                    turned[(i * f) + k] = sum;
                    shares[(at * f) + k] += values[i] * sum * sum;
                }

            if (!(values.Max() < 1 - Closest))
            {
                failed[at] = Failing(part);
                return;
            }

            for (var i = 0; i < f; i++)
            {
                var root = 1 / Math.Sqrt(1 - values[i]);
                var score = 0.0;
                for (var r = 0; r < f; r++)
                {
                    var white = 0.0;
                    for (var k = 0; k <= r; k++) white += whitener[(r * f) + k] * scores.ByCluster[(cluster * f) + k];
                    score += basis[(i * f) + r] * white;
                }

                for (var r = 0; r < f; r++) adjusted[(at * f) + r] += root * score * basis[(i * f) + r];
                for (var k = 0; k < f; k++)
                {
                    var y = turned[(i * f) + k];
                    var a = values[i] * root * y;
                    diagonal[(at * f) + k] += values[i] * root * root * y * y;
                    lengths[(at * f) + k] += a * a;
                    for (var r = 0; r < f; r++) vectors[(((at * f) + k) * f) + r] += a * basis[(i * f) + r];
                }
            }
        }

        /// <summary>The term in which the information without the cluster fails to be positive definite.</summary>
        private int Failing(ReadOnlySpan<double> part)
        {
            var without = new double[f * f];
            for (var i = 0; i < without.Length; i++) without[i] = input.Information[i] - part[i];
            return ScaledCholesky.Factor(without, f, out var term) is null ? term : f - 1;
        }

        private static void AddProducts(ReadOnlySpan<double> vector, Span<double> sum)
        {
            for (var r = 0; r < vector.Length; r++)
                for (var c = 0; c <= r; c++) sum[(r * vector.Length) + c] += vector[r] * vector[c];
        }
    }
}
