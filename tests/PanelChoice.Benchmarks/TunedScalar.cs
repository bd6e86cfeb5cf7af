using PanelChoice.Covariates;

namespace PanelChoice.Benchmarks;

/// <summary>
/// A second yardstick: nested logit log-likelihood and gradient (utility-scaled form, one level of nests under the root) in plain scalar code
/// tuned for speed, sharing nothing with the library. Covariates are dense: situations x alternatives x coefficients with constants, padded with
/// zeros. No allocation in the pass, fused multiply-adds, no exponential of a zero, one logarithm for each nest that is wide.
/// </summary>
internal sealed unsafe class TunedScalar
{
    private const int ChunkOfSums = 1024;

    private readonly int J;
    private readonly int K;
    private readonly int situations;
    private readonly double[] x;
    private readonly byte[] offered;
    private readonly byte[] chosen;
    private readonly byte[] nestOf;
    private readonly int[] memberStart;
    private readonly int[] member;
    private readonly int nests;

    // Alternatives that stand alone follow the nests in the row of the root's children.
    private readonly int[] alone;

    public TunedScalar(CommuteCase made)
    {
        var tree = made.Market.Tree;
        J = tree.Alternatives.Length;
        K = made.Covariates.Covariates.Length;
        situations = made.Covariates.Used.Length;
        nests = tree.Root;
        member = [.. tree.Nodes.Take(nests).SelectMany(n => n.Children)];
        memberStart = new int[nests + 1];
        for (var m = 0; m < nests; m++) memberStart[m + 1] = memberStart[m] + tree.Nodes[m].Children.Length;
        alone = [.. tree.Nodes[tree.Root].Children.Where(tree.IsAlternative)];
        nestOf = [.. Enumerable.Range(0, J).Select(j => (byte)(alone.Contains(j) ? nests : Enumerable.Range(0, nests).First(m => tree.Nodes[m].Children.Contains(j))))];
        x = new double[situations * J * K];
        offered = new byte[situations];
        chosen = new byte[situations];
        Fill(made.Covariates);
    }

    /// <summary>Bytes of the dense covariates.</summary>
    public long Bytes => x.LongLength * sizeof(double);

    /// <summary>The log-likelihood and its gradient by coefficients and dissimilarities.</summary>
    /// <param name="theta">Coefficients, then one dissimilarity for each nest.</param>
    /// <param name="gradient">Receives the derivatives.</param>
    public double Evaluate(ReadOnlySpan<double> theta, Span<double> gradient)
    {
        gradient.Clear();
        var length = K + nests;
        double* sums = stackalloc double[length];
        double* V = stackalloc double[J];
        double* p = stackalloc double[J];
        double* byV = stackalloc double[J];
        double* W = stackalloc double[nests];
        double* E = stackalloc double[nests];
        double* P = stackalloc double[nests];
        double* Pa = stackalloc double[J];
        double* inverse = stackalloc double[nests];
        for (var m = 0; m < nests; m++) inverse[m] = 1 / theta[K + m];
        var total = 0.0;
        fixed (double* b = theta, data = x)
        fixed (byte* offer = offered, choice = chosen, nestBy = nestOf)
        fixed (int* start = memberStart, members = member, single = alone)
        {
            var l = b + K;
            var singles = alone.Length;
            for (var from = 0; from < situations; from += ChunkOfSums)
            {
                var end = Math.Min(situations, from + ChunkOfSums);
                new Span<double>(sums, length).Clear();
                var value = 0.0;
                for (var t = from; t < end; t++)
                {
                    var xs = data + ((long)t * J * K);
                    int has = offer[t];
                    int c = choice[t];
                    for (var j = 0; j < J; j++)
                        if ((has >> j & 1) != 0) V[j] = Dot(xs + (j * K), b, K);

                    // Up: value, entropy and inside probabilities of each nest; the largest value under the root.
                    var best = double.NegativeInfinity;
                    var bestAt = -1;
                    for (var m = 0; m < nests; m++)
                    {
                        var max = double.NegativeInfinity;
                        var arg = -1;
                        var wide = 0;
                        for (var i = start[m]; i < start[m + 1]; i++)
                        {
                            var a = members[i];
                            if ((has >> a & 1) == 0) continue;
                            wide++;
                            if (V[a] > max) (max, arg) = (V[a], a);
                        }

                        W[m] = max;
                        E[m] = 0;
                        if (wide == 0) continue;
                        if (wide == 1) p[arg] = 1;
                        else
                        {
                            var sum = 1.0;
                            var weighted = 0.0;
                            p[arg] = 1;
                            for (var i = start[m]; i < start[m + 1]; i++)
                            {
                                var a = members[i];
                                if (a == arg || (has >> a & 1) == 0) continue;
                                var d = (V[a] - max) * inverse[m];
                                var e = Math.Exp(d);
                                p[a] = e;
                                sum += e;
                                weighted += e * d;
                            }

                            var log = Math.Log(sum);
                            var share = 1 / sum;
                            for (var i = start[m]; i < start[m + 1]; i++) p[members[i]] *= share;
                            E[m] = log - (weighted * share);
                            W[m] = max + (l[m] * log);
                        }

                        if (W[m] > best) (best, bestAt) = (W[m], m);
                    }

                    for (var i = 0; i < singles; i++)
                    {
                        var a = single[i];
                        if ((has >> a & 1) != 0 && V[a] > best) (best, bestAt) = (V[a], nests + i);
                    }

                    var rootSum = 1.0;
                    for (var m = 0; m < nests; m++)
                    {
                        P[m] = m == bestAt ? 1 : double.IsNegativeInfinity(W[m]) ? 0 : Math.Exp(W[m] - best);
                        if (m != bestAt) rootSum += P[m];
                    }

                    for (var i = 0; i < singles; i++)
                    {
                        var a = single[i];
                        if ((has >> a & 1) == 0) continue;
                        Pa[a] = nests + i == bestAt ? 1 : Math.Exp(V[a] - best);
                        if (nests + i != bestAt) rootSum += Pa[a];
                    }

                    var rootValue = best + Math.Log(rootSum);
                    var rootShare = 1 / rootSum;

                    // Down: derivatives of log P by utilities and dissimilarities.
                    int own = nestBy[c];
                    for (var m = 0; m < nests; m++)
                    {
                        var flow = -P[m] * rootShare;
                        if (m == own)
                        {
                            var inside = (V[c] - W[m]) * inverse[m];
                            value += inside + W[m] - rootValue;
                            flow += 1 - inverse[m];
                            sums[K + m] -= inside * inverse[m];
                        }

                        sums[K + m] += flow * E[m];
                        for (var i = start[m]; i < start[m + 1]; i++) byV[members[i]] = flow * p[members[i]];
                    }

                    for (var i = 0; i < singles; i++) byV[single[i]] = -Pa[single[i]] * rootShare;
                    if (own < nests) byV[c] += inverse[own];
                    else
                    {
                        byV[c] += 1;
                        value += V[c] - rootValue;
                    }

                    for (var j = 0; j < J; j++)
                        if ((has >> j & 1) != 0) AddProduct(sums, xs + (j * K), byV[j], K);
                }

                total += value;
                for (var k = 0; k < length; k++) gradient[k] += sums[k];
            }
        }

        return total;
    }

    /// <summary>x'b with four sums side by side, so that no addition waits for the one before.</summary>
    private static double Dot(double* x, double* b, int n)
    {
        double s0 = 0, s1 = 0, s2 = 0, s3 = 0;
        var k = 0;
        for (; k + 4 <= n; k += 4)
        {
            s0 = Math.FusedMultiplyAdd(x[k], b[k], s0);
            s1 = Math.FusedMultiplyAdd(x[k + 1], b[k + 1], s1);
            s2 = Math.FusedMultiplyAdd(x[k + 2], b[k + 2], s2);
            s3 = Math.FusedMultiplyAdd(x[k + 3], b[k + 3], s3);
        }

        for (; k < n; k++) s0 = Math.FusedMultiplyAdd(x[k], b[k], s0);
        return s0 + s1 + (s2 + s3);
    }

    private static void AddProduct(double* sums, double* x, double factor, int n)
    {
        var k = 0;
        for (; k + 4 <= n; k += 4)
        {
            sums[k] = Math.FusedMultiplyAdd(factor, x[k], sums[k]);
            sums[k + 1] = Math.FusedMultiplyAdd(factor, x[k + 1], sums[k + 1]);
            sums[k + 2] = Math.FusedMultiplyAdd(factor, x[k + 2], sums[k + 2]);
            sums[k + 3] = Math.FusedMultiplyAdd(factor, x[k + 3], sums[k + 3]);
        }

        for (; k < n; k++) sums[k] = Math.FusedMultiplyAdd(factor, x[k], sums[k]);
    }

    private void Fill(CovariateSet set)
    {
        for (var t = 0; t < situations; t++)
        {
            chosen[t] = (byte)set.Panel.Chosen[t];
            for (var j = 0; j < J; j++)
                if (set.Panel.Offered[(t * J) + j]) offered[t] |= (byte)(1 << j);
        }

        for (var k = 0; k < K; k++)
        {
            var covariate = set.Covariates[k];
            var enters = covariate.Enters.Length;
            for (var place = 0; place < enters; place++)
            {
                var j = covariate.Enters[place];
                for (var t = 0; t < situations; t++)
                    if ((offered[t] >> j & 1) != 0) x[(((long)t * J) + j) * K + k] = covariate.IsConstant ? 1 : covariate.Values[(t * enters) + place];
            }
        }
    }
}
