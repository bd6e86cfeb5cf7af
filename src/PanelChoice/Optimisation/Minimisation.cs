namespace PanelChoice.Optimisation;

/// <summary>Why a minimisation ended, decided where the loop stops.</summary>
internal enum Termination
{
    /// <summary>The Newton decrement fell to the tolerance and the Hessian has no direction of negative curvature.</summary>
    DecrementReached,

    /// <summary>The Newton decrement is small and rounding lets it fall no further.</summary>
    RoundingReached,

    /// <summary>The caller asked to stop.</summary>
    AskedToStop,

    /// <summary>The limit on iterations was reached.</summary>
    IterationLimit,

    /// <summary>No step, however small, lowers the function.</summary>
    NoProgress,

    /// <summary>The function is not finite at the starting point.</summary>
    StartNotFinite,
}

/// <summary>How a minimisation is run. Coordinates should be scaled so that a step of 1 matters in each.</summary>
/// <param name="Tolerance">The Newton decrement sqrt(g' H^-1 g) at which to stop: a distance in units of 1 / sqrt(curvature).</param>
/// <param name="UncheckedLastStep">
/// Below this decrement one more Newton step is taken without evaluating the function again (its error is of the order of the decrement
/// squared); 0 checks every step.
/// </param>
/// <param name="InitialRadius">First radius of the trust region.</param>
/// <param name="MaxIterations">Limit on steps tried, accepted or not.</param>
internal sealed record MinimisationSettings(
    double Tolerance = 1e-10, double UncheckedLastStep = 0, double InitialRadius = 5, int MaxIterations = 200);

/// <summary>A point at which the minimisation stands, shown to the caller before each step.</summary>
/// <param name="Point">The point.</param>
/// <param name="At">Function and derivatives there.</param>
/// <param name="Spectrum">Eigenvalues and eigenvectors of the Hessian there.</param>
/// <param name="Decrement">The Newton decrement; infinite where a direction of negative curvature leaves.</param>
internal sealed record Standing(double[] Point, SmoothValue At, Spectrum Spectrum, double Decrement);

/// <summary>What a minimisation came to. The point is the best one seen, whatever the termination.</summary>
/// <param name="Point">The point.</param>
/// <param name="Value">The function there.</param>
/// <param name="At">Function and derivatives at the last point evaluated: at the point itself unless the last step went unchecked.</param>
/// <param name="Decrement">The Newton decrement at the last point evaluated.</param>
/// <param name="Termination">Why it ended.</param>
/// <param name="Iterations">Steps tried.</param>
/// <param name="Evaluations">Evaluations of the function with its derivatives.</param>
internal sealed record Minimum(
    double[] Point, double Value, SmoothValue At, double Decrement, Termination Termination, int Iterations, int Evaluations)
{
    /// <summary>Whether the point is a local minimum to the accuracy asked for.</summary>
    public bool IsMinimum => Termination is Termination.DecrementReached or Termination.RoundingReached;
}
