namespace PanelChoice.Inference;

/// <summary>
/// Bias-reduced clustered (CV2): V = H^-1 (sum r_g r_g') H^-1 with r_g = (I - H_g H^-1)^(-1/2) s_g, the principal root; for a linear model the form of Bell
/// and McCaffrey (2002), X_g'(I - X_g H^-1 X_g')^(-1/2) e_g, which it equals. With W H W' = I it is r_g = W^-1 (I - M_g)^(-1/2) W s_g, M_g = W H_g W'
/// symmetric, whatever root W of H^-1 is taken.
/// <para>
/// Each term is read against t with its own degrees of freedom after Satterthwaite: (tr P)^2 / tr(P^2), P_gh = c'H^-1 A_g [1(g = h) H_g - H_g H^-1 H_h] A_h'
/// H^-1 c, A_g = (I - H_g H^-1)^(-1/2) (Bell and McCaffrey 2002). With z = W c and a_g = M_g (I - M_g)^(-1/2) z this is P_gh = 1(g = h) p_g - a_g'a_h, so
/// that tr(P^2) = sum (p_g^2 - 2 p_g a_g'a_g) + |sum a_g a_g'|^2 (Frobenius): no matrix over pairs of clusters is ever made. And tr P = c'H^-1 c.
/// </para>
/// <para>
/// For a likelihood that is not that of a linear model this is an extension: the working model behind it is that the variance of a cluster's score is its
/// part of the information, H_g; it is this project's derivation, and no paper for nested logit is known to it.
/// </para>
/// </summary>
internal static class BiasReducedCovariance
{
    /// <summary>The estimate.</summary>
    public static CovarianceEstimate Estimate(InferenceInput input, ClusterSweep sweep)
    {
        var clusters = input.Clusters.Length;
        if (clusters < 2) return Refuse("There is one cluster only: nothing tells how clusters vary.");
        if (!sweep.NotPositive.IsEmpty)
        {
            var (cluster, term) = sweep.NotPositive[0];
            var more = sweep.NotPositive.Length > 1 ? $" (and {sweep.NotPositive.Length - 1} more, one at a time)" : "";
            return Refuse(
                $"Without {input.ClusterBy} {input.Clusters[cluster]}{more} the information left is not positive definite in {PooledCovariance.NameOf(input, term)}, "
                + "so that its scores cannot be adjusted.");
        }

        var f = input.Free.Length;
        var values = Turned(sweep.Whitener, sweep.Meat, f);
        var smallest = sweep.DegreesOfFreedom.Where(double.IsFinite).DefaultIfEmpty(1).Min();
        return new CovarianceEstimate(
            CovarianceKind.BiasReduced, MathNet.Numerics.LinearAlgebra.Matrix<double>.Build.DenseOfRowMajor(f, f, values), 1, clusters, smallest,
            input.IsWeighted ? ["The degrees of freedom of the bias-reduced figures take sampling weights for inverse variances."] : [], null, [])
        {
            DegreesByTerm = [.. sweep.DegreesOfFreedom],
        };
    }

    /// <summary>W' meat W.</summary>
    private static double[] Turned(double[] whitener, double[] meat, int f)
    {
        var half = new double[f * f];
        for (var r = 0; r < f; r++)
            for (var c = 0; c < f; c++)
                for (var k = c; k < f; k++) half[(r * f) + c] += meat[(r * f) + k] * whitener[(k * f) + c];
        var whole = new double[f * f];
        for (var r = 0; r < f; r++)
            for (var c = 0; c <= r; c++)
            {
                for (var k = r; k < f; k++) whole[(r * f) + c] += whitener[(k * f) + r] * half[(k * f) + c];
                whole[(c * f) + r] = whole[(r * f) + c];
            }

        return whole;
    }

    private static CovarianceEstimate Refuse(string reason) => CovarianceEstimate.Refused(CovarianceKind.BiasReduced, reason);
}
