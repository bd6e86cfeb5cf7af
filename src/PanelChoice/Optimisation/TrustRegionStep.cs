namespace PanelChoice.Optimisation;

/// <summary>
/// The exact minimiser of the quadratic model g'p + p'Hp/2 inside a ball (Moré and Sorensen 1983, "Computing a trust region step"), by the
/// eigenvalues of H: dimensions here are those of a model's parameters, so that one decomposition costs less than one evaluation.
/// </summary>
internal static class TrustRegionStep
{
    /// <summary>Eigenvalues within this share of the largest are rounding, and count as 0.</summary>
    public const double Flat = 1e-13;

    /// <summary>The step.</summary>
    /// <param name="spectrum">H.</param>
    /// <param name="gradient">g along the eigenvectors.</param>
    /// <param name="radius">Radius of the ball, above 0.</param>
    /// <returns>The step along the eigenvectors, and the decrease that the model predicts.</returns>
    public static (double[] Step, double Predicted) Solve(Spectrum spectrum, ReadOnlySpan<double> gradient, double radius)
    {
        var values = spectrum.Values;
        var n = values.Length;
        var floor = Flat * spectrum.Largest;
        var step = new double[n];
        if (n == 0) return (step, 0);
        if (values[0] >= -floor)
        {
            for (var i = 0; i < n; i++) step[i] = floor > 0 ? -gradient[i] / Math.Max(values[i], floor) : -gradient[i] * radius;
            if (Length(step) <= radius) return (step, Predicted(values, gradient, step));
        }

        // With s = mu + lambda_1 > 0 the step is -g_i / (lambda_i - lambda_1 + s); its length falls from its value at s = 0 to 0.
        var low = Math.Max(0, values[0]);
        var gradientLength = Length(gradient);
        if (values[0] <= 0)
        {
            var rest = 0.0;
            var blocked = false;
            for (var i = 0; i < n; i++)
            {
                var gap = values[i] - values[0];
                if (gap <= floor)
                {
                    blocked |= Math.Abs(gradient[i]) > 1e-14 * gradientLength;
                    step[i] = 0;
                }
                else
                {
                    step[i] = -gradient[i] / gap;
                    rest += step[i] * step[i];
                }
            }

            if (!blocked && rest <= radius * radius)
            {
                // The hard case: the gradient has no part along the lowest curvature, so the way down is either way along it.
                step[0] = Math.Sqrt((radius * radius) - rest);
                return (step, Predicted(values, gradient, step));
            }
        }

        var high = Math.Max(gradientLength / radius, low);
        var s = low > 0 ? low : high;
        for (var iteration = 0; iteration < 100; iteration++)
        {
            double length2 = 0, slope = 0;
            for (var i = 0; i < n; i++)
            {
                var d = values[i] - values[0] + s;
                step[i] = -gradient[i] / d;
                length2 += step[i] * step[i];
                slope += step[i] * step[i] / d;
            }

            var length = Math.Sqrt(length2);
            if (Math.Abs(length - radius) <= 1e-6 * radius || high - low <= 1e-15 * high) break;
            if (length > radius) low = s;
            else high = s;
            // Newton on 1/radius - 1/length, which is nearly linear in s.
            var next = s + (length2 / slope * ((length - radius) / radius));
            s = next > low && next < high ? next : low > 0 ? Math.Sqrt(low * high) : high * 0.01;
        }

        return (step, Predicted(values, gradient, step));
    }

    /// <summary>Length of a vector.</summary>
    public static double Length(ReadOnlySpan<double> vector)
    {
        var sum = 0.0;
        foreach (var v in vector) sum += v * v;
        return Math.Sqrt(sum);
    }

    private static double Predicted(double[] values, ReadOnlySpan<double> gradient, double[] step)
    {
        var sum = 0.0;
        for (var i = 0; i < step.Length; i++) sum -= step[i] * (gradient[i] + (0.5 * values[i] * step[i]));
        return sum;
    }
}
