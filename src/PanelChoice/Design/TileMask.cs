using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;

namespace PanelChoice.Design;

/// <summary>Masks of a tile as vectors.</summary>
internal static class TileMask
{
    /// <summary>All bits of each of the tile's lanes whose bit is set.</summary>
    [MethodImpl(MethodImplOptions.AggressiveInlining)]
    public static Vector512<double> Lanes(ulong mask)
    {
        var bits = Vector512.Create(1UL, 2, 4, 8, 16, 32, 64, 128);
        return Vector512.Equals(Vector512.Create(mask) & bits, bits).AsDouble();
    }
}
