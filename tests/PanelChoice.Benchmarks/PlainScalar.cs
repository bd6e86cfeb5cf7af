using PanelChoice.Covariates;

namespace PanelChoice.Benchmarks;

/// <summary>
/// The scalar reference that the goals are set against: nested logit log-likelihood and gradient (utility-scaled form, one level of nests under
/// the root) as the formulas read, one loop for each sum, over dense covariates (situations x alternatives x coefficients with constants, padded
/// with zeros), with the runtime's exponential and logarithm and no allocation in the pass. <see cref="TunedScalar"/> is what tuning makes of it.
/// </summary>
internal sealed class PlainScalar
{
    private readonly int J;
    private readonly int K;
    private readonly int nests;
    private readonly int situations;
    private readonly int[] nestOf;
    private readonly double[] x;
    private readonly bool[] offered;
    private readonly int[] chosen;
    private readonly double[] v;
    private readonly double[] inside;
    private readonly double[] slope;
    private readonly double[] largest;
    private readonly double[] sum;
    private readonly double[] value;
    private readonly double[] entropy;
    private readonly double[] share;

    public PlainScalar(CommuteCase made)
    {
        var (tree, set) = (made.Market.Tree, made.Covariates);
        J = tree.Alternatives.Length;
        K = set.Covariates.Length;
        situations = set.Used.Length;

        // An alternative that stands alone is a nest of one with dissimilarity 1, numbered behind the others.
        var alone = tree.Nodes[tree.Root].Children.Where(tree.IsAlternative).ToArray();
        nests = tree.Root + alone.Length;
        nestOf = [.. Enumerable.Range(0, J).Select(j => alone.Contains(j) ? tree.Root + Array.IndexOf(alone, j) : Enumerable.Range(0, tree.Root).First(m => tree.Nodes[m].Children.Contains(j)))];
        offered = [.. set.Used.SelectMany(o => set.Panel.Offered.AsSpan(o * J, J).ToArray())];
        chosen = [.. set.Used.Select(o => set.Panel.Chosen[o])];
        x = new double[situations * J * K];
        for (var k = 0; k < K; k++) Fill(set.Covariates[k], k);
        v = new double[J];
        inside = new double[J];
        slope = new double[J];
        largest = new double[nests];
        sum = new double[nests];
        value = new double[nests];
        entropy = new double[nests];
        share = new double[nests];
    }

    /// <summary>The log-likelihood and its gradient by coefficients and dissimilarities.</summary>
    /// <param name="theta">Coefficients, then one dissimilarity for each nest of several.</param>
    /// <param name="gradient">Receives the derivatives.</param>
    public double Evaluate(ReadOnlySpan<double> theta, Span<double> gradient)
    {
        gradient.Clear();
        var total = 0.0;
        for (var t = 0; t < situations; t++) total += AddSituation(t, theta, gradient);
        return total;
    }

    private double AddSituation(int t, ReadOnlySpan<double> theta, Span<double> gradient)
    {
        var row = t * J;
        Array.Fill(largest, double.NegativeInfinity);
        for (var j = 0; j < J; j++)
        {
            if (!offered[row + j]) continue;
            var utility = 0.0;
            for (var k = 0; k < K; k++) utility += theta[k] * x[((row + j) * K) + k];
            v[j] = utility;
            largest[nestOf[j]] = Math.Max(largest[nestOf[j]], utility);
        }

        Array.Clear(sum);
        Array.Clear(entropy);
        for (var j = 0; j < J; j++)
        {
            if (!offered[row + j]) continue;
            var m = nestOf[j];
            inside[j] = Math.Exp((v[j] - largest[m]) / Dissimilarity(theta, m));
            sum[m] += inside[j];
        }

        var best = double.NegativeInfinity;
        for (var m = 0; m < nests; m++)
        {
            value[m] = sum[m] > 0 ? largest[m] + (Dissimilarity(theta, m) * Math.Log(sum[m])) : double.NegativeInfinity;
            best = Math.Max(best, value[m]);
        }

        var whole = 0.0;
        for (var m = 0; m < nests; m++)
        {
            share[m] = Math.Exp(value[m] - best);
            whole += share[m];
        }

        var logWhole = best + Math.Log(whole);
        for (var m = 0; m < nests; m++) share[m] /= whole;
        for (var j = 0; j < J; j++)
        {
            if (!offered[row + j]) continue;
            var m = nestOf[j];
            inside[j] /= sum[m];
            entropy[m] -= inside[j] * (v[j] - value[m]) / Dissimilarity(theta, m);
        }

        var choice = chosen[t];
        var own = nestOf[choice];
        var l = Dissimilarity(theta, own);
        var logInside = (v[choice] - value[own]) / l;
        for (var m = 0; m < nests; m++)
        {
            if (K + m >= theta.Length || sum[m] == 0) continue;
            gradient[K + m] += ((m == own ? 1 - (1 / l) : 0) - share[m]) * entropy[m];
            if (m == own) gradient[K + m] -= logInside / l;
        }

        for (var j = 0; j < J; j++)
        {
            if (!offered[row + j]) continue;
            var m = nestOf[j];
            slope[j] = ((m == own ? 1 - (1 / l) : 0) - share[m]) * inside[j];
            if (j == choice) slope[j] += 1 / l;
            for (var k = 0; k < K; k++) gradient[k] += slope[j] * x[((row + j) * K) + k];
        }

        return logInside + value[own] - logWhole;
    }

    private double Dissimilarity(ReadOnlySpan<double> theta, int nest) => K + nest < theta.Length ? theta[K + nest] : 1;

    private void Fill(Covariate covariate, int k)
    {
        var enters = covariate.Enters.Length;
        for (var t = 0; t < situations; t++)
            for (var place = 0; place < enters; place++)
            {
                var cell = (t * J) + covariate.Enters[place];
                if (offered[cell]) x[(cell * K) + k] = covariate.IsConstant ? 1 : covariate.Values[(t * enters) + place];
            }
    }
}
