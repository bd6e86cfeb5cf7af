using System.Buffers.Binary;
using PanelChoice.Numerics;

namespace PanelChoice.Design.Store;

/// <summary>
/// The first 64 bytes of a store: 8 letters that tell what it is, the version of the layout (4 bytes), where the header begins (8), its length (8), its
/// CRC-32C (4), the CRC-32C of these 32 bytes (4), and zeros. Numbers are little-endian.
/// </summary>
/// <param name="HeaderAt">Where the header begins.</param>
/// <param name="HeaderBytes">Its length.</param>
/// <param name="HeaderChecksum">Its CRC-32C.</param>
internal sealed record StorePreamble(long HeaderAt, long HeaderBytes, uint HeaderChecksum)
{
    /// <summary>Length of the preamble.</summary>
    public const int Bytes = 64;

    /// <summary>Version of the layout, and of what is in it: a covariate that comes out otherwise than before is a new version too.</summary>
    public const int Version = 2;

    private const int Checked = 32;

    private static ReadOnlySpan<byte> Letters => "PANELDSN"u8;

    /// <summary>Whether the bytes begin as a store does, of whatever version.</summary>
    public static bool IsStore(ReadOnlySpan<byte> bytes) => bytes.StartsWith(Letters);

    /// <summary>The version that the bytes of a store tell.</summary>
    public static int VersionOf(ReadOnlySpan<byte> bytes) => BinaryPrimitives.ReadInt32LittleEndian(bytes[8..]);

    /// <summary>Reads a preamble; null where it is damaged.</summary>
    public static StorePreamble? Read(ReadOnlySpan<byte> bytes) =>
        BinaryPrimitives.ReadUInt32LittleEndian(bytes[Checked..]) != Checksum.Of(bytes[..Checked])
            ? null
            : new StorePreamble(
                BinaryPrimitives.ReadInt64LittleEndian(bytes[12..]), BinaryPrimitives.ReadInt64LittleEndian(bytes[20..]),
                BinaryPrimitives.ReadUInt32LittleEndian(bytes[28..]));

    /// <summary>Writes it.</summary>
    public void Write(Span<byte> bytes)
    {
        Letters.CopyTo(bytes);
        BinaryPrimitives.WriteInt32LittleEndian(bytes[8..], Version);
        BinaryPrimitives.WriteInt64LittleEndian(bytes[12..], HeaderAt);
        BinaryPrimitives.WriteInt64LittleEndian(bytes[20..], HeaderBytes);
        BinaryPrimitives.WriteUInt32LittleEndian(bytes[28..], HeaderChecksum);
        BinaryPrimitives.WriteUInt32LittleEndian(bytes[Checked..], Checksum.Of(bytes[..Checked]));
    }

    /// <summary>CRC-32C of the next bytes of a stream.</summary>
    public static uint ChecksumOf(Stream stream, long length)
    {
        var checksum = new Checksum();
        var buffer = new byte[1 << 16];
        for (var left = length; left > 0;)
        {
            var piece = buffer.AsSpan(0, (int)Math.Min(left, buffer.Length));
            stream.ReadExactly(piece);
            checksum.Add(piece);
            left -= piece.Length;
        }

        return checksum.Value;
    }
}
