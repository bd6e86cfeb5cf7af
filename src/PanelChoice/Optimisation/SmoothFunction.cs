namespace PanelChoice.Optimisation;

/// <summary>A function's value with its first and second derivatives at one point.</summary>
/// <param name="Value">The value; not finite where the function is not defined.</param>
/// <param name="Gradient">n first derivatives.</param>
/// <param name="Hessian">n x n second derivatives, row by row, symmetric.</param>
internal sealed record SmoothValue(double Value, double[] Gradient, double[] Hessian)
{
    /// <summary>Whether value, gradient and Hessian are all finite.</summary>
    public bool IsFinite => double.IsFinite(Value) && Array.TrueForAll(Gradient, double.IsFinite) && Array.TrueForAll(Hessian, double.IsFinite);
}

/// <summary>A twice differentiable function to be minimised.</summary>
/// <param name="x">n coordinates.</param>
internal delegate SmoothValue SmoothFunction(ReadOnlySpan<double> x);
