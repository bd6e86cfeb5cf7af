using System.Collections.Immutable;
using MathNet.Numerics.Distributions;
using PanelChoice.Design;
using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>
/// Wald tests (Wald 1943): W = (R phi - r)' (R V R')^-1 (R phi - r), phi the estimates with the logarithm of a dissimilarity in its place, V by the delta method. Against
/// chi-square(q), or W / q against F(q, d) where the covariance has d degrees of freedom.
/// </summary>
internal static class WaldTests
{
    /// <summary>The kinds of covariance that support a test.</summary>
    public static IEnumerable<CovarianceKind> Kinds =>
        Enum.GetValues<CovarianceKind>().Where(k => k is not (CovarianceKind.OuterProduct or CovarianceKind.ClusterUncorrected));

    /// <summary>One test with one covariance.</summary>
    /// <param name="input">What is known of the fitted model.</param>
    /// <param name="test">The test.</param>
    /// <param name="covariance">The covariance.</param>
    /// <param name="bootstrap">How the bootstrap went: its replicates bound the rank of its covariance.</param>
    public static WaldFigures Of(InferenceInput input, TermTest test, CovarianceEstimate covariance, BootstrapSummary? bootstrap)
    {
        var q = test.Restriction.Count;
        WaldFigures Refuse(string reason) => new(null, q, null, null, reason);
        if (test.Withheld is { } withheld) return Refuse(withheld);
        if (covariance.Matrix is not { } v) return Refuse(covariance.Refusal ?? "There is no such covariance.");
        if (covariance.Kind == CovarianceKind.Pooled && input.IsWeighted) return Refuse("It depends on the unit of the sampling weights, so no test is made from it.");
        var f = input.Free.Length;
        var r = test.Restriction.Matrix;
        ImmutableArray<int> used = [.. Enumerable.Range(0, f).Where(c => Enumerable.Range(0, q).Any(i => r[(i * f) + c] != 0))];
        foreach (var place in used)
            if (covariance.RefusedParameters.IndexOf(place) is >= 0 and var at) return Refuse(covariance.RefusedReasons[at]);
        if (covariance.Clusters is { } clusters && q > clusters - 1)
            return Refuse($"{q} restrictions are more than the {clusters - 1} that {clusters} clusters can test together.");
        if (covariance.Kind == CovarianceKind.Bootstrap && bootstrap is not null && q > bootstrap.Done - 1)
            return Refuse($"{q} restrictions are more than the {bootstrap.Done - 1} that {bootstrap.Done} replicates can test together.");

        var slope = used.ToDictionary(c => c, c => input.Kinds[input.Free[c]] == ParameterKind.Dissimilarity ? 1 / input.Estimates[input.Free[c]] : 1.0);
        // A single term's own variance stands even where the matrix around it had to be repaired.
        var single = used.Length == 1 && !covariance.Variances.IsDefaultOrEmpty;
        double Covariance(int a, int b) => single ? covariance.Variances[a] : v[a, b];
        var spread = new double[q * q];
        var gap = Gap(input, test);
        for (var i = 0; i < q; i++)
            for (var j = 0; j < q; j++)
                foreach (var a in used)
                    foreach (var b in used) spread[(i * q) + j] += r[(i * f) + a] * slope[a] * Covariance(a, b) * slope[b] * r[(j * f) + b];
        if (ScaledCholesky.Factor(spread, q, out var failed) is not { } factor)
            return Refuse(
                q == 1
                    ? "The variance of what is tested is not positive."
                    : $"The covariance of what is tested is singular: restriction {failed + 1} of {q} cannot be told from those before it.");
        var solved = (double[])gap.Clone();
        factor.Solve(solved);
        var w = 0.0;
        for (var i = 0; i < q; i++) w += gap[i] * solved[i];
        if (!double.IsFinite(w) || w < 0) return Refuse("The statistic leaves the range of numbers.");
        // Where degrees of freedom differ between terms, the fewest of those in the test count.
        var degrees = covariance.DegreesByTerm.IsDefaultOrEmpty ? covariance.DegreesOfFreedom : used.Min(c => covariance.DegreesByTerm[c]);
        if (degrees is { } none && !double.IsFinite(none)) return Refuse("Its degrees of freedom do not exist, so that no p-value is made from it.");
        return degrees is { } d
            ? new WaldFigures(w / q, q, d, UpperF(q, d, w / q), null)
            : new WaldFigures(w, q, null, UpperChiSquare(q, w), null);
    }

    /// <summary>R phi - r.</summary>
    public static double[] Gap(InferenceInput input, TermTest test)
    {
        var f = input.Free.Length;
        var gap = new double[test.Restriction.Count];
        for (var i = 0; i < gap.Length; i++)
        {
            gap[i] = -test.Restriction.Values[i];
            for (var c = 0; c < f; c++)
                if (test.Restriction.Matrix[(i * f) + c] is not 0 and var x)
                    gap[i] += x * (input.Kinds[input.Free[c]] == ParameterKind.Dissimilarity ? Math.Log(input.Estimates[input.Free[c]]) : input.Estimates[input.Free[c]]);
        }

        return gap;
    }

    /// <summary>P(chi-square(q) >= x), with its digits where it is small.</summary>
    public static double UpperChiSquare(int q, double x) => x <= 0 ? 1 : MathNet.Numerics.SpecialFunctions.GammaUpperRegularized(q / 2.0, x / 2);

    /// <summary>P(F(q, d) >= x); for one restriction the two-sided p-value of t(d).</summary>
    private static double UpperF(int q, double d, double x) => q == 1
        ? 2 * StudentT.CDF(0, 1, d, -Math.Sqrt(x))
        : x <= 0 ? 1 : MathNet.Numerics.SpecialFunctions.BetaRegularized(d / 2, q / 2.0, d / (d + (q * x)));
}
