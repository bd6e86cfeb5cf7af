using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>
/// Outer product: V = (sum s_it s_it')^-1 over the scores of the contributions (Berndt, Hall, Hall and Hausman 1974). By the information
/// equality it estimates the same as the pooled one when the model is right, so that the two side by side are a check on specification.
/// </summary>
internal static class OuterProductCovariance
{
    /// <summary>The estimate.</summary>
    /// <param name="input">What is known of the model.</param>
    /// <param name="meat">sum s_it s_it', F x F.</param>
    public static CovarianceEstimate Estimate(InferenceInput input, ReadOnlySpan<double> meat)
    {
        var f = input.Free.Length;
        if (ScaledCholesky.Factor(meat, f, out var failed) is not { } factor)
            return CovarianceEstimate.Refused(
                CovarianceKind.OuterProduct,
                $"The summed outer products of {input.Contributions} scores are singular: no score tells {PooledCovariance.NameOf(input, failed)} from the other terms.");
        return CovarianceEstimate.Of(
            CovarianceKind.OuterProduct, factor.Inverse(), f, 1, null,
            input.IsWeighted ? ["It depends on the unit of the sampling weights, so no interval or p-value is made from it."] : []);
    }
}
