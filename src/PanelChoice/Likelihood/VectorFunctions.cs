using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;

namespace PanelChoice.Likelihood;

/// <summary>
/// Exponential and logarithm of rows, by the library's vector functions. Each loop does nothing else: inside larger loops the runtime no
/// longer puts the function's code in place, and a call with its arguments in memory costs more than the function.
/// </summary>
internal static class VectorFunctions
{
    /// <summary>exp(-700) is about 1e-304: what lies lower counts as 0. From about -708 on the library's function is twenty times slower.</summary>
    private const double LowestExponent = -700;

    /// <summary>e^x for x of at most about 700; exactly 0 from <see cref="LowestExponent"/> down, exactly 1 at 0.</summary>
    [MethodImpl(MethodImplOptions.NoInlining)]
    public static void Exp(ref double from, ref double to, nuint lanes)
    {
        var lowest = Vector512.Create(LowestExponent);
        for (nuint lane = 0; lane < lanes; lane += (nuint)Vector512<double>.Count)
        {
            var x = Vector512.LoadUnsafe(ref from, lane);
            var power = Vector512.Exp(Vector512.MaxNative(x, lowest));
            Vector512.ConditionalSelect(Vector512.GreaterThan(x, lowest), power, Vector512<double>.Zero).StoreUnsafe(ref to, lane);
        }
    }

    /// <summary>Natural logarithm of positive numbers; exactly 0 at 1.</summary>
    [MethodImpl(MethodImplOptions.NoInlining)]
    public static void Log(ref double from, ref double to, nuint lanes)
    {
        for (nuint lane = 0; lane < lanes; lane += (nuint)Vector512<double>.Count)
            Vector512.Log(Vector512.LoadUnsafe(ref from, lane)).StoreUnsafe(ref to, lane);
    }
}
