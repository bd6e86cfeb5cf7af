using System.Collections.Immutable;
using MathNet.Numerics.LinearAlgebra;

namespace PanelChoice.Inference;

/// <summary>
/// Clustered two ways: V = V_cluster + V_second - V_both, each component H^-1 (sum s_h s_h') H^-1 over its own groups h with its own factor n/(n-1), n its
/// number of groups; V_both by the pair of both, and so the robust matrix with its factor where each pair holds one occasion. Against t(min G - 1)
/// (Cameron, Gelbach and Miller 2011). It allows for dependence between any two occasions that share a cluster or a group of the second grouping.
/// </summary>
/// <remarks>
/// The difference need not be positive semi-definite. A standard error needs c'Vc > 0 of its own term and nothing else, so that it is taken before any
/// repair, and refused for a term where that fails (Roodman, MacKinnon, Nielsen and Webb 2019 on repairs that change figures without need). The matrix
/// that joint tests use has its negative eigenvalues set to 0, which is flagged.
/// </remarks>
internal static class TwoWayCovariance
{
    /// <summary>The estimate, and how it came about (null when refused beforehand).</summary>
    /// <param name="input">What is known of the model.</param>
    /// <param name="bread">H^-1, F x F.</param>
    /// <param name="scores">Sums of scores.</param>
    /// <param name="threads">Threads; no figure depends on it.</param>
    public static (CovarianceEstimate Covariance, TwoWaySummary? Summary) Estimate(InferenceInput input, double[] bread, ScoreSums scores, int threads)
    {
        if (input.Second is not { } second) return (Refuse("The study names no second cluster."), null);
        if (second.Refusal is { } refusal) return (Refuse(refusal), null);
        if (input.Contribution != ContributionKind.Occasion) return (Refuse("The likelihood is integrated over the person, so that an occasion has no score of its own."), null);
        var clusters = input.Clusters.Length;
        if (clusters < 2) return (Refuse("There is one cluster only: nothing tells how clusters vary."), null);
        var sums = second.Sums(threads, scores.OuterProduct);
        if (sums.Groups < 2) return (Refuse($"All occasions share one {second.By}: nothing tells how these vary."), null);

        var f = input.Free.Length;
        var first = Sandwich.Of(bread, Sandwich.OuterSum(scores.ByCluster.AsMemory(), f, threads), Factor(clusters), f);
        var other = Sandwich.Of(bread, sums.ByGroup.AsSpan(), Factor(sums.Groups), f);
        var both = Sandwich.Of(bread, sums.ByPair.AsSpan(), Factor(sums.Pairs), f);
        var values = new double[f * f];
        for (var i = 0; i < values.Length; i++) values[i] = first[i] + other[i] - both[i];
        var variances = Enumerable.Range(0, f).Select(i => values[(i * f) + i]).ToImmutableArray();

        // A term's variance is compared with what was added and taken away: rounding must not pass for a variance.
        var negative = Enumerable.Range(0, f)
            .Where(i => !(variances[i] > 1e-12 * (first[(i * f) + i] + other[(i * f) + i] + both[(i * f) + i]))).ToImmutableArray();
        var (matrix, touched) = Repaired(values, f);
        foreach (var r in negative)
            for (var c = 0; c < f; c++) matrix[r, c] = matrix[c, r] = double.NaN;
        var degrees = Math.Min(clusters, sums.Groups) - 1;
        var covariance = new CovarianceEstimate(
            CovarianceKind.TwoWay, matrix, 1, Math.Min(clusters, sums.Groups), degrees, Cautions(input, second, sums, negative, touched), null, negative)
        {
            RefusedReasons = [.. negative.Select(_ => $"Its variance by {input.ClusterBy} and {second.By} comes out negative before any repair, so it is not available.")],
            Variances = variances,
        };
        return (covariance, new TwoWaySummary(second.By, clusters, sums.Groups, sums.Pairs, negative, touched.Length > 0) { Touched = touched });
    }

    /// <summary>The matrix with negative eigenvalues set to 0, and the parameters whose variance that raised beyond rounding.</summary>
    private static (Matrix<double> Matrix, ImmutableArray<int> Touched) Repaired(double[] values, int f)
    {
        var matrix = Matrix<double>.Build.DenseOfRowMajor(f, f, values);
        // In units of the terms' own spread, so that the units of covariates do not decide which eigenvalue counts.
        var scale = Vector<double>.Build.Dense(f, i => values[(i * f) + i] == 0 ? 1 : 1 / Math.Sqrt(Math.Abs(values[(i * f) + i])));
        var scaled = Matrix<double>.Build.Dense(f, f, (r, c) => matrix[r, c] * scale[r] * scale[c]);
        if (!scaled.Enumerate().All(double.IsFinite)) return (matrix, []);
        var spectrum = scaled.Evd(Symmetricity.Symmetric);
        var eigenvalues = spectrum.EigenValues.Real();
        if (eigenvalues.Minimum() >= -f * 1e-12 * eigenvalues.AbsoluteMaximum()) return (matrix, []);
        var kept = eigenvalues.Map(x => Math.Max(x, 0));
        var repaired = spectrum.EigenVectors * Matrix<double>.Build.DenseOfDiagonalVector(kept) * spectrum.EigenVectors.Transpose();
        var whole = Matrix<double>.Build.Dense(f, f, (r, c) => (repaired[r, c] + repaired[c, r]) / 2 / (scale[r] * scale[c]));
        return (whole, [.. Enumerable.Range(0, f).Where(i => !(whole[i, i] - matrix[i, i] <= 1e-6 * Math.Abs(matrix[i, i])))]);
    }

    private static ImmutableArray<string> Cautions(
        InferenceInput input, SecondClusters second, SecondSums sums, ImmutableArray<int> negative, ImmutableArray<int> touched)
    {
        var cautions = ImmutableArray.CreateBuilder<string>();
        var fewest = Math.Min(input.Clusters.Length, sums.Groups);
        if (fewest < ClusterCovariance.FewClusters)
            cautions.Add(
                $"Clustered two ways, the figures rest on {fewest} groups by {(sums.Groups < input.Clusters.Length ? second.By : input.ClusterBy)}; with so few they tend "
                + "to be too small and can fall below those clustered one way.");
        if (negative.Length > 0)
            cautions.Add($"The variance clustered two ways comes out negative for {Names(input, negative)}, so that none is given there.");
        if (touched.Length > 0)
            cautions.Add(
                $"The matrix clustered two ways had negative eigenvalues, which were set to 0; that raised the variance of {Names(input, touched)} in it. Standard errors, "
                + "intervals and p-values are from before that.");
        return cautions.ToImmutable();
    }

    private static string Names(InferenceInput input, ImmutableArray<int> places) => places.Length <= 6
        ? string.Join(", ", places.Select(p => PooledCovariance.NameOf(input, p)))
        : $"{string.Join(", ", places.Take(5).Select(p => PooledCovariance.NameOf(input, p)))} and {places.Length - 5} more";

    private static double Factor(int groups) => groups / (groups - 1.0);

    private static CovarianceEstimate Refuse(string reason) => CovarianceEstimate.Refused(CovarianceKind.TwoWay, reason);
}
