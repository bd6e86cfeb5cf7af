namespace PanelChoice.Benchmarks;

/// <summary>What must agree for a measurement to mean anything. A disagreement is told at once and ends the program with its own code.</summary>
internal static class Agreement
{
    /// <summary>Whether anything disagreed.</summary>
    public static bool IsBroken { get; private set; }

    /// <summary>Two log-likelihoods with gradients that should be equal but for the order of their sums, relative to their largest figure.</summary>
    public static void Close(string what, double value, ReadOnlySpan<double> gradient, double otherValue, ReadOnlySpan<double> otherGradient, double tolerance)
    {
        var far = Math.Abs(value - otherValue) / Math.Abs(otherValue);
        double largest = 0, apart = 0;
        for (var k = 0; k < gradient.Length; k++)
        {
            largest = Math.Max(largest, Math.Abs(otherGradient[k]));
            apart = Math.Max(apart, Math.Abs(gradient[k] - otherGradient[k]));
        }

        far = Math.Max(far, apart / largest);
        if (!(far <= tolerance)) Break($"{what} differ by {far:E1}, more than {tolerance:E0}");
    }

    /// <summary>Two rows of numbers that must have the same bits.</summary>
    public static void SameBits(string what, ReadOnlySpan<double> one, ReadOnlySpan<double> other)
    {
        var same = one.Length == other.Length;
        for (var i = 0; same && i < one.Length; i++) same = BitConverter.DoubleToInt64Bits(one[i]) == BitConverter.DoubleToInt64Bits(other[i]);
        if (!same) Break($"{what} do not have the same bits");
    }

    /// <summary>Anything else that must hold.</summary>
    public static void Holds(bool condition, string otherwise)
    {
        if (!condition) Break(otherwise);
    }

    private static void Break(string what)
    {
        IsBroken = true;
        Console.WriteLine($"WRONG: {what}.");
    }
}
