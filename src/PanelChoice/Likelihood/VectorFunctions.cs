using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Numerics;

namespace PanelChoice.Likelihood;

/// <summary>Exponential and logarithm of rows (<see cref="VectorElementary"/>); lanes are a multiple of 8. No loop calls anything, so that its constants stay in registers.</summary>
internal static class VectorFunctions
{
    /// <summary>e^x within 1 unit in the last place, exactly 0 below <see cref="VectorElementary.LowestExponent"/> and exactly 1 at 0.</summary>
    [MethodImpl(MethodImplOptions.NoInlining)]
    public static void Exp(ref double from, ref double to, nuint lanes)
    {
        for (nuint lane = 0; lane < lanes; lane += (nuint)Vector512<double>.Count)
            VectorElementary.Exp(Vector512.LoadUnsafe(ref from, lane)).StoreUnsafe(ref to, lane);
    }

    /// <summary>Natural logarithm within 1 unit in the last place, exactly 0 at 1. The rows may not overlap.</summary>
    [MethodImpl(MethodImplOptions.NoInlining)]
    public static void Log(ref double from, ref double to, nuint lanes)
    {
        var isNormal = Vector512<double>.AllBitsSet;
        for (nuint lane = 0; lane < lanes; lane += (nuint)Vector512<double>.Count)
        {
            var x = Vector512.LoadUnsafe(ref from, lane);
            isNormal &= VectorElementary.IsPositiveNormal(x);
            VectorElementary.LogOfNormal(x).StoreUnsafe(ref to, lane);
        }

        if (!Vector512.EqualsAll(isNormal.AsInt64(), Vector512<long>.AllBitsSet)) LogOfTheRest(ref from, ref to, lanes);
    }

    /// <summary>What is 0, negative, subnormal, infinite or NaN: only figures that have already left the model's domain get here, so one by one will do.</summary>
    [MethodImpl(MethodImplOptions.NoInlining)]
    private static void LogOfTheRest(ref double from, ref double to, nuint lanes)
    {
        for (nuint lane = 0; lane < lanes; lane++)
        {
            var x = Unsafe.Add(ref from, lane);
            if (!double.IsNormal(x) || x < 0) Unsafe.Add(ref to, lane) = Math.Log(x);
        }
    }
}
