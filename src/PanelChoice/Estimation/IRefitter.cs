using System.Collections.Immutable;

namespace PanelChoice.Estimation;

/// <summary>A request to estimate again with other cluster weights.</summary>
/// <param name="ClusterWeight">Factor for each cluster, 0 or more; it multiplies sampling weights.</param>
/// <param name="Start">All K parameters to start from.</param>
/// <param name="Held">Parameters held at the value in <paramref name="Start"/>, besides the fixed ones.</param>
public sealed record RefitRequest(ImmutableArray<double> ClusterWeight, ImmutableArray<double> Start, ImmutableArray<int> Held)
{
    /// <summary>Number of the refit in its series: starts that are tried after a failure are drawn from its stream.</summary>
    public int Number { get; init; }
}

/// <summary>What a refit came to.</summary>
/// <param name="Status">How it ended.</param>
/// <param name="Parameters">All K parameters.</param>
/// <param name="LogLikelihood">Weighted log-likelihood.</param>
/// <param name="Iterations">Iterations in all.</param>
/// <param name="Retried">Whether it needed another start than the one asked for.</param>
/// <param name="FailureKind">Kind of failure in plain words ("separated", "not identified", ...); null when converged.</param>
/// <param name="FailedParameters">Parameters the failure is about; may be empty.</param>
public sealed record RefitOutcome(
    FitStatus Status, ImmutableArray<double> Parameters, double LogLikelihood, int Iterations, bool Retried, string? FailureKind,
    ImmutableArray<int> FailedParameters)
{
    /// <summary>
    /// The refit's certificate: its Newton decrement sqrt(g' H^-1 g) at the end, or a bound on it, g the gradient and H minus the Hessian of its own
    /// weighted log-likelihood. It says how far the maximum may still be, in pooled standard errors of the refit. NaN where the refit did not converge.
    /// </summary>
    public double Decrement { get; init; } = double.NaN;
}

/// <summary>Estimates the same model again under other weights. An outcome depends on its request alone, never on the rest of the batch.</summary>
public interface IRefitter
{
    /// <summary>One outcome for each request, in the same order.</summary>
    /// <param name="batch">Requests.</param>
    /// <param name="cancellation">Stops between requests.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    ImmutableArray<RefitOutcome> Refit(ImmutableArray<RefitRequest> batch, CancellationToken cancellation);
}
