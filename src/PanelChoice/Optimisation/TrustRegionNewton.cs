namespace PanelChoice.Optimisation;

/// <summary>
/// Minimises a function by Newton steps on its exact Hessian inside a trust region (Moré and Sorensen 1983; Conn, Gould and Toint 2000,
/// "Trust-region methods"). Deterministic; it leaves saddle points along negative curvature; a trial point at which the function is not
/// finite shrinks the region. Near the minimum, where differences of the function are rounding, a step is judged by the Newton decrement
/// instead, so that the quadratic finish goes on until the gradient itself is rounding.
/// </summary>
internal static class TrustRegionNewton
{
    /// <summary>Below this decrement a minimum that rounding keeps from the tolerance still counts as one.</summary>
    private const double Acceptable = 1e-6;

    /// <summary>Share of the function's value below which its differences count as rounding.</summary>
    private const double Rounding = 1e-12;

    /// <summary>Minimises.</summary>
    /// <param name="function">The function.</param>
    /// <param name="start">n coordinates to start from.</param>
    /// <param name="settings">How to run.</param>
    /// <param name="stop">Asked at every point reached; true ends the run there. Null never stops.</param>
    public static Minimum Minimise(SmoothFunction function, ReadOnlySpan<double> start, MinimisationSettings settings, Func<Standing, bool>? stop = null)
    {
        var x = start.ToArray();
        var at = function(x);
        var evaluations = 1;
        if (!at.IsFinite) return new Minimum(x, at.Value, at, double.PositiveInfinity, Termination.StartNotFinite, 0, evaluations);

        var spectrum = Spectrum.Of(at.Hessian);
        var radius = settings.InitialRadius;
        for (var iteration = 0; ; iteration++)
        {
            var gradient = spectrum.Coordinates(at.Gradient);
            var decrement = Decrement(spectrum, gradient);
            Minimum End(Termination termination) => new(x, at.Value, at, decrement, termination, iteration, evaluations);

            if (stop is not null && stop(new Standing(x, at, spectrum, decrement))) return End(Termination.AskedToStop);
            if (decrement <= settings.Tolerance) return End(Termination.DecrementReached);
            if (iteration == settings.MaxIterations) return End(Termination.IterationLimit);

            var (along, predicted) = TrustRegionStep.Solve(spectrum, gradient, radius);
            var length = TrustRegionStep.Length(along);
            var trialPoint = spectrum.Combine(along);
            for (var i = 0; i < x.Length; i++) trialPoint[i] += x[i];
            if (decrement <= settings.UncheckedLastStep && length < radius)
                return new Minimum(trialPoint, at.Value - predicted, at, decrement, Termination.DecrementReached, iteration + 1, evaluations);

            var trial = function(trialPoint);
            evaluations++;
            var isFinite = trial.IsFinite;
            if (predicted <= Rounding * Math.Abs(at.Value))
            {
                var after = isFinite ? Decrement(spectrum, spectrum.Coordinates(trial.Gradient)) : double.PositiveInfinity;
                if (!(after < 0.5 * decrement)) return End(decrement <= Acceptable ? Termination.RoundingReached : Termination.NoProgress);
                (x, at) = (trialPoint, trial);
                spectrum = Spectrum.Of(at.Hessian);
                continue;
            }

            var ratio = isFinite ? (at.Value - trial.Value) / predicted : double.NegativeInfinity;
            if (ratio < 0.25) radius = Math.Min(radius, length) * (isFinite ? 0.25 : 0.1);
            else if (ratio > 0.75 && length > 0.8 * radius) radius = length * (ratio > 0.9 ? 4 : 2);
            if (ratio > 1e-4)
            {
                (x, at) = (trialPoint, trial);
                spectrum = Spectrum.Of(at.Hessian);
            }
            else if (radius <= 1e-15 * (1 + TrustRegionStep.Length(x)))
            {
                return End(decrement <= Acceptable ? Termination.RoundingReached : Termination.NoProgress);
            }
        }
    }

    /// <summary>sqrt(g' H^-1 g) with flat directions at their rounding; infinite with a direction of negative curvature.</summary>
    private static double Decrement(Spectrum spectrum, double[] gradient)
    {
        var floor = TrustRegionStep.Flat * spectrum.Largest;
        if (spectrum.Count > 0 && spectrum.Values[0] < -floor) return double.PositiveInfinity;
        var sum = 0.0;
        for (var i = 0; i < gradient.Length; i++)
            if (gradient[i] != 0) sum += gradient[i] * gradient[i] / Math.Max(spectrum.Values[i], floor);
        return Math.Sqrt(sum);
    }
}
