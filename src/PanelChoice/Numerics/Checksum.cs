using System.Numerics;
using System.Runtime.InteropServices;

namespace PanelChoice.Numerics;

/// <summary>CRC-32C (Castagnoli's polynomial, reflected; RFC 3720), for which processors have an instruction.</summary>
internal sealed class Checksum
{
    private uint state = uint.MaxValue;

    /// <summary>The checksum of the bytes added so far.</summary>
    public uint Value => ~state;

    /// <summary>The checksum of some bytes.</summary>
    public static uint Of(ReadOnlySpan<byte> bytes)
    {
        var checksum = new Checksum();
        checksum.Add(bytes);
        return checksum.Value;
    }

    /// <summary>Adds more bytes.</summary>
    public void Add(ReadOnlySpan<byte> bytes)
    {
        var words = MemoryMarshal.Cast<byte, ulong>(bytes);
        foreach (var word in words) state = BitOperations.Crc32C(state, word);
        foreach (var b in bytes[(words.Length * sizeof(ulong))..]) state = BitOperations.Crc32C(state, b);
    }
}
