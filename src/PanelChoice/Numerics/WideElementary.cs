using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using System.Runtime.Intrinsics.X86;

namespace PanelChoice.Numerics;

/// <summary>
/// The exponential that <see cref="VectorElementary"/> promises in half the time, with instructions that only 512-bit machines have: a table held
/// in two registers and a scaler by powers of two. Their counterparts for logarithms and reciprocals were measured to bring nothing.
/// </summary>
internal static class WideElementary
{
    /// <summary>Whether this machine has the instructions.</summary>
    public static bool IsSupported
    {
        [MethodImpl(MethodImplOptions.AggressiveInlining)]
        get => Avx512F.IsSupported;
    }

    /// <summary>
    /// e^x as <see cref="VectorElementary.Exp"/> states it. With k the whole number next to 16 x / log 2, j its last four bits and
    /// r = x - k log 2 / 16, |r| at most log 2 / 32:
    /// <code>e^x = 2^floor(k/16) (T + T (d + r + r^2 q(r))),  T = 2^(j/16) rounded,  d what rounding took from it</code>
    /// </summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> Exp(Vector512<double> x)
    {
        var shifter = Vector512.Create(6755399441055744.0);
        var highest = Vector512.MinNative(Vector512.Create(710.0), x);
        var shifted = Vector512.FusedMultiplyAdd(highest, Vector512.Create(23.083120654223414), shifter);
        var k = shifted - shifter;
        var r = Vector512.FusedMultiplyAdd(k, Vector512.Create(-0.04332169878499658), highest);
        r = Vector512.FusedMultiplyAdd(k, Vector512.Create(-1.4494042586539372e-18), r);

        // The permutation reads four bits of each index and no more.
        var t = Avx512F.PermuteVar8x64x2(
            Vector512.Create(
                1.0, 1.0442737824274138, 1.0905077326652577, 1.1387886347566916, 1.189207115002721, 1.241857812073484, 1.2968395546510096,
                1.3542555469368927),
            shifted.AsInt64(),
            Vector512.Create(
                1.4142135623730951, 1.4768261459394993, 1.5422108254079407, 1.6104903319492543, 1.681792830507429, 1.7562521603732995,
                1.8340080864093424, 1.9152065613971474));
        var tail = Avx512F.PermuteVar8x64x2(
            Vector512.Create(0.0, 8.189317638195515e-17, -2.7939114859515733e-17, 7.826573258636076e-17, 3.3484623336251524e-17, 3.750854201303127e-17, 1.9572585293112036e-17, 5.68648095791174e-17),
            shifted.AsInt64(),
            Vector512.Create(-6.835808657661922e-17, -2.3591094770850053e-17, 5.1548301170786783e-17, 1.5341410053603723e-17, 4.875160526227062e-17, 1.685487290628973e-17, 1.790126907604513e-17, -5.545065618639427e-17));
        var r2 = r * r;
        var low = Vector512.FusedMultiplyAdd(r, Vector512.Create(0.16666666666666669), Vector512.Create(0.5));
        var high = Vector512.FusedMultiplyAdd(r, Vector512.Create(0.00833333333299209), Vector512.Create(0.041666666663595475));
        var top = Vector512.FusedMultiplyAdd(r, Vector512.Create(0.0001984146378747018), Vector512.Create(0.0013889063440655327));
        var q = Vector512.FusedMultiplyAdd(r2, Vector512.FusedMultiplyAdd(r2, top, high), low);
        var p = Vector512.FusedMultiplyAdd(r2, q, r + tail);
        var result = Avx512F.Scale(Vector512.FusedMultiplyAdd(t, p, t), k * Vector512.Create(0.0625));
        return Vector512.ConditionalSelect(
            Vector512.LessThan(x, Vector512.Create(VectorElementary.LowestExponent)), Vector512<double>.Zero, result);
    }
}
