using System.Collections.Immutable;

namespace PanelChoice.Estimation;

/// <summary>
/// Linear restrictions R phi = r on the F free parameters: phi is the coefficient itself, and the logarithm of a dissimilarity, on which its ratios are differences.
/// </summary>
/// <param name="Matrix">q x F, row by row, of full rank.</param>
/// <param name="Values">q values r.</param>
internal sealed record LinearRestriction(ImmutableArray<double> Matrix, ImmutableArray<double> Values)
{
    /// <summary>Number of restrictions q.</summary>
    public int Count => Values.Length;
}

/// <summary>The maximum of a likelihood under restrictions, or why there is none.</summary>
/// <param name="Parameters">All K parameters; the best point seen.</param>
/// <param name="LogLikelihood">The weighted log-likelihood there.</param>
/// <param name="Failure">Why it is no interior maximum, as a sentence; null when it is one.</param>
internal sealed record RestrictedFit(ImmutableArray<double> Parameters, double LogLikelihood, string? Failure);

/// <summary>Derivatives of a likelihood at a point by phi, which has the logarithm of a dissimilarity in its place.</summary>
/// <param name="ByCluster">G x F: sums of weighted scores by cluster.</param>
/// <param name="Information">F x F: minus the second derivatives of the weighted log-likelihood.</param>
internal sealed record PointScores(double[] ByCluster, double[] Information);

/// <summary>Estimates the same model again under linear restrictions.</summary>
internal interface IRestrictedRefitter
{
    /// <summary>The log-likelihood of the model without restrictions.</summary>
    double LogLikelihood { get; }

    /// <summary>The maximum under restrictions, from several starts.</summary>
    /// <param name="restriction">The restrictions.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    RestrictedFit Fit(LinearRestriction restriction);

    /// <summary>The maximum under restrictions that lies near a point.</summary>
    /// <param name="restriction">The restrictions.</param>
    /// <param name="near">K parameters; they need not meet the restrictions.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    RestrictedFit FitNear(LinearRestriction restriction, ReadOnlySpan<double> near);

    /// <summary>Scores by cluster and information at a point.</summary>
    /// <param name="parameters">K parameters.</param>
    PointScores At(ReadOnlySpan<double> parameters);
}
