using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>
/// Pooled: V = H^-1, H minus the Hessian of the log-likelihood. It counts each occasion as independent evidence and trusts the model
/// (Fisher 1925; standard errors of maximum likelihood as everybody prints them).
/// </summary>
internal static class PooledCovariance
{
    /// <summary>The estimate; <paramref name="bread"/> is H^-1, F x F, or null with the refusal when H is not positive definite.</summary>
    public static CovarianceEstimate Estimate(InferenceInput input, out double[]? bread)
    {
        var f = input.Free.Length;
        bread = ScaledCholesky.Factor(input.Information.AsSpan(), f, out var failed)?.Inverse();
        if (bread is null)
            return CovarianceEstimate.Refused(
                CovarianceKind.Pooled,
                $"Minus the Hessian is not positive definite: {NameOf(input, failed)} cannot be told from the other terms at the estimate.");
        return CovarianceEstimate.Of(
            CovarianceKind.Pooled, bread, f, 1, null,
            input.IsWeighted ? ["It depends on the unit of the sampling weights, so no interval or p-value is made from it."] : []);
    }

    /// <summary>A free parameter's name in quotation marks.</summary>
    internal static string NameOf(InferenceInput input, int free) => $"'{input.Labels[input.Free[free]]}'";
}
