using MathNet.Numerics;

namespace PanelChoice.Inference;

/// <summary>How far bootstrap figures would move if the same number of replicates were drawn with another seed.</summary>
internal static class MonteCarloErrors
{
    /// <summary>
    /// Of a standard error made from B replicates: se sqrt((k - 1) / (4 B)), k their fourth central moment over the squared second one (the delta
    /// method on the variance of a sample variance, Cramer 1946). A normal distribution has k = 3, which gives the usual se / sqrt(2 B).
    /// </summary>
    /// <param name="standardError">The standard error.</param>
    /// <param name="values">The replicates.</param>
    public static double OfStandardError(double standardError, double[] values) =>
        standardError * Math.Sqrt(Math.Max(0, Kurtosis(values) - 1) / (4 * values.Length));

    /// <summary>Fourth central moment over the squared second one; 3 for a normal distribution, NaN where nothing varies.</summary>
    public static double Kurtosis(double[] values)
    {
        var mean = values.Average();
        double second = 0, fourth = 0;
        foreach (var x in values)
        {
            var square = (x - mean) * (x - mean);
            second += square;
            fourth += square * square;
        }

        return values.Length * fourth / (second * second);
    }

    /// <summary>
    /// Of an order statistic or a point between two: sqrt(C2 - C1^2), Cj = sum w_i x_(i)^j, w_i the probability that a beta variable with parameters m and
    /// n + 1 - m falls between (i - 1)/n and i/n, m the place from 1 (Maritz and Jarrett 1978, "A note on estimating the variance of the sample median").
    /// </summary>
    /// <param name="values">The n values, ascending.</param>
    /// <param name="place">The place m, from 1 to n; fractions lie between two.</param>
    public static double OfQuantile(double[] values, double place)
    {
        var n = values.Length;
        var at = values[Math.Clamp((int)place, 1, n) - 1];
        double first = 0, second = 0, below = 0;
        for (var i = 1; i <= n; i++)
        {
            var up = i == n ? 1 : SpecialFunctions.BetaRegularized(place, n + 1 - place, i / (double)n);
            // Distances from the quantile itself, so that no digits are lost in the difference of squares.
            var x = values[i - 1] - at;
            first += (up - below) * x;
            second += (up - below) * x * x;
            below = up;
        }

        return Math.Sqrt(Math.Max(0, second - (first * first)));
    }
}
