namespace PanelChoice.Inference;

/// <summary>
/// Percentile interval of bootstrap replicates (Efron 1979). The ends are order statistics p (n + 1) of the n requested replicates, with
/// linear interpolation between neighbours (definition 6 of Hyndman and Fan 1996), so that 399 replicates and 95 percent give the 10th
/// from either end. A failed replicate has no value: it is counted below everything for the lower end and above everything for the upper,
/// which makes the interval the widest that the failures could have led to.
/// </summary>
internal static class Percentiles
{
    /// <summary>Order statistics nearer to the end than this are unreliable.</summary>
    public const int NearestReliable = 5;

    /// <summary>The place of the lower end among the ordered replicates, from 1; fractions lie between two.</summary>
    public static double Position(int requested, double confidence) =>
        // Rounding: 0.025 x 400 must be 10, not 9.999...
        Math.Round((1 - confidence) / 2 * (requested + 1), 9);

    /// <summary>The interval, or the reason why there is none.</summary>
    /// <param name="values">Values of the replicates that converged, ascending.</param>
    /// <param name="failed">Number of failed replicates.</param>
    /// <param name="confidence">Confidence level.</param>
    public static (Interval? Interval, string? Reason) Of(double[] values, int failed, double confidence)
    {
        var requested = values.Length + failed;
        var position = Position(requested, confidence);
        if (position < 1) return (null, $"{requested} replicates are too few for percentiles at this confidence.");
        if ((int)position <= failed)
            return (null, $"{failed} of {requested} replicates failed, as many as lie beyond an end of the interval, so that the end could be anywhere.");
        return (new Interval(At(values, position - failed), At(values, values.Length + 1 - (position - failed))), null);
    }

    /// <summary>Monte-Carlo errors of the two ends of an interval that exists.</summary>
    /// <param name="values">Values of the replicates that converged, ascending.</param>
    /// <param name="failed">Number of failed replicates.</param>
    /// <param name="confidence">Confidence level.</param>
    public static (double Low, double High) Errors(double[] values, int failed, double confidence)
    {
        var place = Position(values.Length + failed, confidence) - failed;
        return (MonteCarloErrors.OfQuantile(values, place), MonteCarloErrors.OfQuantile(values, values.Length + 1 - place));
    }

    /// <summary>The value at a place from 1; a fraction lies between two.</summary>
    public static double At(double[] values, double place)
    {
        var whole = (int)place;
        var part = place - whole;
        return part > 0 ? values[whole - 1] + (part * (values[whole] - values[whole - 1])) : values[whole - 1];
    }
}
