using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>How a column is held, known when a loop is compiled: each coding has loops of its own.</summary>
internal interface IHeldAs
{
    /// <summary>Bytes of one value.</summary>
    static abstract int Width { get; }

    /// <summary>Eight values from a lane on, in the units in which they are held.</summary>
    static abstract Vector512<double> Load(ref byte column, nuint lane);
}

/// <summary>Held as doubles.</summary>
internal readonly struct HeldAsIs : IHeldAs
{
    public static int Width => sizeof(double);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> Load(ref byte column, nuint lane) => Vector512.LoadUnsafe(ref Unsafe.As<byte, double>(ref column), lane);
}

/// <summary>Held as 32-bit whole numbers.</summary>
internal readonly struct HeldAsWhole32 : IHeldAs
{
    public static int Width => sizeof(int);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> Load(ref byte column, nuint lane) =>
        ColumnUnfolding.Doubles(Vector256.LoadUnsafe(ref Unsafe.As<byte, int>(ref column), lane));
}

/// <summary>Held as 16-bit whole numbers.</summary>
internal readonly struct HeldAsWhole16 : IHeldAs
{
    public static int Width => sizeof(short);

    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> Load(ref byte column, nuint lane) =>
        ColumnUnfolding.Doubles(ColumnUnfolding.Whole32(Vector128.LoadUnsafe(ref Unsafe.As<byte, short>(ref column), lane)));
}
