using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// Slopes a_c = s o_c + g e_c, weight times d log P / d W of a child (<see cref="StripProbabilities"/>). They are worked out where they are used:
/// whoever needs them takes references to the rows into its loop.
/// </summary>
internal static class Slopes
{
    /// <summary>A tile's slopes of an alternative.</summary>
    /// <param name="flowOverSum">g of the node above: its row.</param>
    /// <param name="power">e of the alternative: its row.</param>
    /// <param name="weight">The situations' weights.</param>
    /// <param name="chosen">The tile's choice mask.</param>
    /// <param name="scale">s of the node above.</param>
    /// <param name="lane">The tile's first lane.</param>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> OfAlternative(
        ref double flowOverSum, ref double power, ref double weight, byte chosen, Vector512<double> scale, nuint lane)
    {
        var o = TileMask.Lanes(chosen) & Vector512.LoadUnsafe(ref weight, lane);
        return Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref flowOverSum, lane), Vector512.LoadUnsafe(ref power, lane), o * scale);
    }

    /// <summary>A tile's slopes of an inner node below the root.</summary>
    /// <param name="flowOverSum">g of the node above: its row.</param>
    /// <param name="power">e of the node: its row.</param>
    /// <param name="onPath">o of the node: its row.</param>
    /// <param name="scale">s of the node above.</param>
    /// <param name="lane">The tile's first lane.</param>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> OfNode(ref double flowOverSum, ref double power, ref double onPath, Vector512<double> scale, nuint lane) =>
        Vector512.FusedMultiplyAdd(Vector512.LoadUnsafe(ref flowOverSum, lane), Vector512.LoadUnsafe(ref power, lane), scale * Vector512.LoadUnsafe(ref onPath, lane));
}
