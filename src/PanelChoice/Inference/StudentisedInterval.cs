using PanelChoice.Design;

namespace PanelChoice.Inference;

/// <summary>
/// Bootstrap-t interval (Efron 1979; Hall 1988): with t* = (th* - th) / se* over the replicates, se* the clustered standard error made in each replicate from
/// its own scores and information, the ends are th - t*_(1-a) se and th - t*_(a) se. A dissimilarity is taken on its log scale. Failed replicates count
/// at both extremes.
/// </summary>
internal static class StudentisedInterval
{
    /// <summary>The interval with the Monte-Carlo errors of its ends, or the reason why there is none.</summary>
    /// <param name="kind">Coefficient or dissimilarity.</param>
    /// <param name="estimate">The full estimate.</param>
    /// <param name="standardError">Its clustered standard error.</param>
    /// <param name="values">Value in each replicate; NaN where it failed.</param>
    /// <param name="errors">Clustered standard error in each replicate; NaN where there is none.</param>
    /// <param name="confidence">Confidence level.</param>
    public static (Interval? Interval, Interval? Errors, string? Reason) Of(
        ParameterKind kind, double estimate, double standardError, double[] values, double[] errors, double confidence)
    {
        var isLog = kind == ParameterKind.Dissimilarity;
        var t = Enumerable.Range(0, values.Length)
            .Select(r => isLog ? Math.Log(values[r] / estimate) * values[r] / errors[r] : (values[r] - estimate) / errors[r])
            .Where(double.IsFinite).Order().ToArray();
        var failed = values.Length - t.Length;
        var (ends, reason) = Percentiles.Of(t, failed, confidence);
        if (ends is null) return (null, null, reason);
        var (low, high) = Percentiles.Errors(t, failed, confidence);
        if (!isLog)
            return (new Interval(estimate - (ends.High * standardError), estimate - (ends.Low * standardError)), new Interval(high * standardError, low * standardError), null);
        var scale = standardError / estimate;
        var interval = new Interval(estimate * Math.Exp(-ends.High * scale), estimate * Math.Exp(-ends.Low * scale));
        return (interval, new Interval(interval.Low * high * scale, interval.High * low * scale), null);
    }
}
