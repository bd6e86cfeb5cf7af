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
        var whole = (int)position;
        if (whole <= failed)
            return (null, $"{failed} of {requested} replicates failed, as many as lie beyond an end of the interval, so that the end could be anywhere.");
        var part = position - whole;
        var low = values[whole - 1 - failed];
        var high = values[^(whole - failed)];
        if (part > 0)
        {
            low += part * (values[whole - failed] - low);
            high += part * (values[^(whole + 1 - failed)] - high);
        }

        return (new Interval(low, high), null);
    }
}
