using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;

namespace PanelChoice.Numerics;

/// <summary>
/// Exponential and natural logarithm of eight numbers at a time, small enough to be put in place inside a loop; the constants stand in the
/// bodies, because static fields would be read again for each vector. Plain vector arithmetic serves every width; for the exponential there is a
/// faster way where the machine has 512-bit instructions (<see cref="WideElementary"/>).
/// <para>
/// The polynomials interpolate the function at the Chebyshev nodes of the reduced interval (computed with 80 digits, then rounded), which leaves
/// less than 0.01 (exp) and 0.05 (log) units in the last place; the stated errors are those of the rounded steps.
/// </para>
/// </summary>
internal static class VectorElementary
{
    /// <summary>Below this, e^x counts as 0: from about -708.4 on it is subnormal.</summary>
    public const double LowestExponent = -708;

    /// <summary>
    /// e^x within 1 unit in the last place; exactly 1 at 0 and -0, exactly 0 below <see cref="LowestExponent"/>, infinity where the result exceeds the
    /// largest finite number, NaN at NaN. With n the whole number next to x / log 2 and r = x - n log 2, |r| at most log 2 / 2:
    /// <code>e^x = 2^n (1 + r + r^2 q(r)),  q = even(r^2) + r odd(r^2)</code>
    /// </summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> Exp(Vector512<double> x) => WideElementary.IsSupported ? WideElementary.Exp(x) : PlainExp(x);

    /// <summary><see cref="Exp"/> for any width.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    internal static Vector512<double> PlainExp(Vector512<double> x)
    {
        // Added to 1.5 x 2^52 a number is rounded to a whole one, which stands in the low bits of the sum.
        var shifter = Vector512.Create(6755399441055744.0);
        var shifted = Vector512.FusedMultiplyAdd(x, Vector512.Create(1.4426950408889634), shifter);
        var n = shifted - shifter;

        // The first difference is exact: its bits fit between those of x and the last bit of log 2.
        var r = Vector512.FusedMultiplyAdd(n, Vector512.Create(-0.6931471805599453), x);
        r = Vector512.FusedMultiplyAdd(n, Vector512.Create(-2.3190468138462996e-17), r);

        var r2 = r * r;
        var even = Vector512.FusedMultiplyAdd(r2, Vector512.Create(2.0914679595617734e-09), Vector512.Create(2.7557273660822466e-07));
        var odd = Vector512.FusedMultiplyAdd(r2, Vector512.Create(2.510520668068106e-08), Vector512.Create(2.7557255425009614e-06));
        even = Vector512.FusedMultiplyAdd(r2, even, Vector512.Create(2.480158732553378e-05));
        odd = Vector512.FusedMultiplyAdd(r2, odd, Vector512.Create(0.00019841269874801073));
        even = Vector512.FusedMultiplyAdd(r2, even, Vector512.Create(0.0013888888888883752));
        odd = Vector512.FusedMultiplyAdd(r2, odd, Vector512.Create(0.008333333333326141));
        even = Vector512.FusedMultiplyAdd(r2, even, Vector512.Create(0.04166666666666667));
        odd = Vector512.FusedMultiplyAdd(r2, odd, Vector512.Create(0.1666666666666667));
        even = Vector512.FusedMultiplyAdd(r2, even, Vector512.Create(0.5));
        var q = Vector512.FusedMultiplyAdd(r, odd, even);
        var power = Vector512<double>.One + Vector512.FusedMultiplyAdd(r2, q, r);

        // 2^n by adding n to the exponent, right wherever the result is a normal number.
        var result = ((shifted.AsInt64() << 52) + power.AsInt64()).AsDouble();
        result = Vector512.ConditionalSelect(Vector512.LessThan(x, Vector512.Create(LowestExponent)), Vector512<double>.Zero, result);
        result = Vector512.ConditionalSelect(
            Vector512.GreaterThan(x, Vector512.Create(709.782712893384)), Vector512.Create(double.PositiveInfinity), result);
        return result;
    }

    /// <summary>All bits of each lane that <see cref="LogOfNormal"/> is made for: positive, normal, finite.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> IsPositiveNormal(Vector512<double> x) =>
        Vector512.GreaterThanOrEqual(x, Vector512.Create(2.2250738585072014e-308)) & Vector512.LessThanOrEqual(x, Vector512.Create(double.MaxValue));

    /// <summary>
    /// log x of positive normal numbers within 1 unit in the last place; exactly 0 at 1; of no meaning for anything else.
    /// With x = 2^k m, m in [1/sqrt 2, sqrt 2), f = m - 1, s = f / (2 + f) and h = f^2 / 2:
    /// <code>log m = 2 artanh s = f - h + s (h + s^2 R(s^2)),  R(z) = 2/3 + 2 z / 5 + 2 z^2 / 7 + ...</code>
    /// so that what is rounded is small beside f.
    /// </summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> LogOfNormal(Vector512<double> x)
    {
        // With the distance from 1/sqrt 2 to 1 added to its bits, x crosses a power of 2 where m crosses sqrt 2.
        var bits = x.AsInt64() + Vector512.Create(0x3FF0000000000000 - 0x3FE6A09E00000000);
        var shifter = Vector512.Create(4503599627370496.0);
        var k = (Vector512.ShiftRightLogical(bits, 52) | shifter.AsInt64()).AsDouble() - Vector512.Create(4503599627370496.0 + 1023);
        var m = ((bits & Vector512.Create(0x000FFFFFFFFFFFFF)) + Vector512.Create(0x3FE6A09E00000000)).AsDouble();

        var f = m - Vector512<double>.One;
        var s = f / (f + Vector512.Create(2.0));
        var h = Vector512.Create(0.5) * f * f;
        var z = s * s;
        var w = z * z;
        var even = Vector512.FusedMultiplyAdd(w, Vector512.Create(0.1461646325895801), Vector512.Create(0.18182889158299903));
        var odd = Vector512.FusedMultiplyAdd(w, Vector512.Create(0.15331720502376558), Vector512.Create(0.22222211134341624));
        even = Vector512.FusedMultiplyAdd(w, even, Vector512.Create(0.2857142862597826));
        odd = Vector512.FusedMultiplyAdd(w, odd, Vector512.Create(0.399999999998995));
        even = Vector512.FusedMultiplyAdd(w, even, Vector512.Create(0.666666666666667));
        var tail = z * Vector512.FusedMultiplyAdd(z, odd, even);

        // log 2 in two parts, the first so short that its product with k is exact.
        var small = Vector512.FusedMultiplyAdd(s, h + tail, k * Vector512.Create(4.7493250390316726e-07));
        return Vector512.FusedMultiplyAdd(k, Vector512.Create(0.6931467056274414), f - (h - small));
    }
}
