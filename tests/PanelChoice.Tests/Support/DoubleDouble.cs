namespace PanelChoice.Tests.Support;

/// <summary>
/// A number as the unevaluated sum of two doubles, about 31 digits (Dekker 1971), with the exponential and logarithm written from their series:
/// the reference for functions in double precision. Relative errors: sum and product 1e-31, exponential and logarithm about 1e-28.
/// </summary>
internal readonly record struct DoubleDouble(double High, double Low)
{
    /// <summary>log 2 = 0.69314718055994530941723212145817656807550...</summary>
    private static readonly DoubleDouble LogOf2 = new(0.6931471805599453, 2.3190468138462996e-17);

    public static DoubleDouble Of(double value) => new(value, 0);

    public static DoubleDouble operator +(DoubleDouble a, DoubleDouble b)
    {
        var high = Sum(a.High, b.High);
        var low = Sum(a.Low, b.Low);
        high = FastSum(high.High, high.Low + low.High);
        return FastSum(high.High, high.Low + low.Low);
    }

    public static DoubleDouble operator -(DoubleDouble a) => new(-a.High, -a.Low);

    public static DoubleDouble operator -(DoubleDouble a, DoubleDouble b) => a + -b;

    public static DoubleDouble operator *(DoubleDouble a, DoubleDouble b)
    {
        var product = a.High * b.High;
        var rest = Math.FusedMultiplyAdd(a.High, b.High, -product);
        return FastSum(product, rest + ((a.High * b.Low) + (a.Low * b.High)));
    }

    public static DoubleDouble operator /(DoubleDouble a, DoubleDouble b)
    {
        var q0 = a.High / b.High;
        var rest = a - (b * Of(q0));
        var q1 = rest.High / b.High;
        rest -= b * Of(q1);
        return FastSum(q0, q1) + Of(rest.High / b.High);
    }

    /// <summary>e^x = 2^n times the number returned, which lies between 0.7 and 1.42.</summary>
    public static (DoubleDouble Power, int Exponent) Exp(double x)
    {
        // e^r = (e^(r / 512))^512, the inner one by its Taylor series; what is squared is e^y - 1, so that no digits are lost beside the 1.
        var n = (int)Math.Round(x / LogOf2.High);
        var y = (Of(x) - (Of(n) * LogOf2)) * Of(1.0 / 512);
        var term = y;
        var sum = y;
        for (var i = 2; i <= 10; i++)
        {
            term = term * y / Of(i);
            sum += term;
        }

        for (var i = 0; i < 9; i++) sum = (sum * sum) + (sum * Of(2));
        return (sum + Of(1), n);
    }

    /// <summary>log x of a positive finite number.</summary>
    public static DoubleDouble Log(double x)
    {
        if (Math.Abs(x - 1) < 0.01) return LogNear1(Of(x - 1));

        // One Newton step from the library's logarithm y: log x = y + log(1 + d), d = x e^-y - 1.
        var n = Math.ILogB(x);
        var m = Math.ScaleB(x, -n);
        var y = Math.Log(m);
        var (power, exponent) = Exp(-y);
        var d = (Of(m) * power * Of(Math.ScaleB(1, exponent))) - Of(1);
        return Of(y) + LogNear1(d) + (Of(n) * LogOf2);
    }

    /// <summary>Distance of a double from the number, in units of the last place of the double next to it.</summary>
    public double UnitsInLastPlaceTo(double value)
    {
        var size = Math.Abs(High);
        return Math.Abs(value - High - Low) / (Math.BitIncrement(size) - size);
    }

    /// <summary>log(1 + f) = 2 artanh(f / (2 + f)) by its series, |f| at most 0.01.</summary>
    private static DoubleDouble LogNear1(DoubleDouble f)
    {
        var s = f / (f + Of(2));
        var z = s * s;
        var sum = Of(0);
        for (var i = 15; i >= 1; i -= 2) sum = (sum * z) + (Of(2) / Of(i));
        return s * sum;
    }

    private static DoubleDouble Sum(double a, double b)
    {
        var high = a + b;
        var part = high - a;
        return new DoubleDouble(high, a - (high - part) + (b - part));
    }

    private static DoubleDouble FastSum(double larger, double smaller)
    {
        var high = larger + smaller;
        return new DoubleDouble(high, smaller - (high - larger));
    }
}
