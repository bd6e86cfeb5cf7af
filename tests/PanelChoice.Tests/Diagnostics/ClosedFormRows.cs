namespace PanelChoice.Tests.Diagnostics;

/// <summary>A two-level nested logit in closed form (utility-scaled), written out from the definitions: it shares no code with the library.</summary>
internal sealed class ClosedFormRows
{
    /// <summary>One situation.</summary>
    /// <param name="Offered">Offered alternatives.</param>
    /// <param name="X">Covariates, J x coefficients.</param>
    internal sealed record Row(bool[] Offered, double[,] X);

    private readonly int[] nestOf;
    private readonly int nests;
    private readonly double[] theta;
    private readonly int coefficients;
    private readonly int J;

    /// <summary>The model.</summary>
    /// <param name="nestOf">Nest of each alternative; -1 for one that stands alone.</param>
    /// <param name="theta">Coefficients, then one dissimilarity for each nest.</param>
    public ClosedFormRows(int[] nestOf, double[] theta)
    {
        this.nestOf = nestOf;
        this.theta = theta;
        nests = nestOf.Max() + 1;
        coefficients = theta.Length - nests;
        J = nestOf.Length;
    }

    /// <summary>A situation's probabilities, and residuals and scores of every hypothetical choice.</summary>
    public (double[] P, double[]?[] F, double[]?[] S) Of(Row row)
    {
        double[]?[] f = [.. Enumerable.Range(0, J).Select(i => row.Offered[i] ? Residual(row, i) : null)];
        return (Probabilities(row), f, [.. f.Select(x => x is null ? null : Score(row, x))]);
    }

    private double Lambda(int nest) => theta[coefficients + nest];

    private double[] Utility(Row row)
    {
        var v = new double[J];
        for (var j = 0; j < J; j++)
            for (var k = 0; k < coefficients; k++) v[j] += theta[k] * row.X[j, k];
        return v;
    }

    private int Group(int j) => nestOf[j] >= 0 ? nestOf[j] : nests + j;

    private double GroupLambda(int group) => group < nests ? Lambda(group) : 1;

    private double[] Probabilities(Row row)
    {
        var v = Utility(row);
        var sums = new Dictionary<int, double>();
        for (var j = 0; j < J; j++)
            if (row.Offered[j]) sums[Group(j)] = sums.GetValueOrDefault(Group(j)) + Math.Exp(v[j] / GroupLambda(Group(j)));
        var all = sums.Sum(s => Math.Pow(s.Value, GroupLambda(s.Key)));
        return [.. Enumerable.Range(0, J).Select(j => row.Offered[j]
            ? Math.Exp(v[j] / GroupLambda(Group(j))) / sums[Group(j)] * Math.Pow(sums[Group(j)], GroupLambda(Group(j))) / all
            : 0)];
    }

    /// <summary>
    /// g_j = 1[j = i] / l + 1[j in c] (1 - 1/l) p_j - P_j;  g_l,m = 1[m = c] ((Vbar_m - V_i) / l^2 + h_m) - P_m h_m,  h_m = I_m - Vbar_m / l_m.
    /// </summary>
    private double[] Residual(Row row, int i)
    {
        var v = Utility(row);
        var p = Probabilities(row);
        var f = new double[J + nests];
        var c = Group(i);
        var inGroup = Enumerable.Range(0, J).Where(j => row.Offered[j] && Group(j) == c).Sum(j => p[j]);
        for (var j = 0; j < J; j++)
        {
            if (!row.Offered[j]) continue;
            f[j] = -p[j];
            if (j == i) f[j] += 1 / GroupLambda(c);
            if (Group(j) == c) f[j] += (1 - (1 / GroupLambda(c))) * p[j] / inGroup;
        }

        for (var m = 0; m < nests; m++)
        {
            var members = Enumerable.Range(0, J).Where(j => row.Offered[j] && nestOf[j] == m).ToList();
            if (members.Count == 0) continue;
            var nestShare = members.Sum(j => p[j]);
            var mean = members.Sum(j => p[j] / nestShare * v[j]);
            var h = Math.Log(members.Sum(j => Math.Exp(v[j] / Lambda(m)))) - (mean / Lambda(m));
            f[J + m] = -nestShare * h;
            if (m == c) f[J + m] += ((mean - v[i]) / (Lambda(m) * Lambda(m))) + h;
        }

        return f;
    }

    private double[] Score(Row row, double[] f)
    {
        var s = new double[theta.Length];
        for (var k = 0; k < coefficients; k++)
            for (var j = 0; j < J; j++) s[k] += row.X[j, k] * f[j];
        for (var m = 0; m < nests; m++) s[coefficients + m] = f[J + m];
        return s;
    }
}
