using System.Buffers.Binary;
using System.IO.Compression;

namespace PanelChoice.Data;

/// <summary>
/// The unpacked content of a gzip file, which counts what it hands out: the runtime's decoder takes the end of a file that was cut off for
/// the end of its content, so that the length stored in the last four bytes (RFC 1952) is the only witness.
/// </summary>
internal sealed class GzipContent(Stream packed) : Stream
{
    private readonly GZipStream content = new(packed, CompressionMode.Decompress, leaveOpen: true);
    private uint length;

    public override bool CanRead => true;

    public override bool CanSeek => false;

    public override bool CanWrite => false;

    public override long Length => throw new NotSupportedException();

    public override long Position
    {
        get => throw new NotSupportedException();
        set => throw new NotSupportedException();
    }

    /// <summary>Whether all content was handed out.</summary>
    public bool IsAtEnd { get; private set; }

    /// <summary>Whether what was handed out is as long as the file says, modulo 2^32; to be asked at the end of the content.</summary>
    public bool IsWhole()
    {
        Span<byte> stored = stackalloc byte[4];
        packed.Position = packed.Length - stored.Length;
        packed.ReadExactly(stored);
        return BinaryPrimitives.ReadUInt32LittleEndian(stored) == length;
    }

    public override int Read(byte[] buffer, int offset, int count) => Read(buffer.AsSpan(offset, count));

    public override int Read(Span<byte> buffer)
    {
        var count = content.Read(buffer);
        IsAtEnd |= count == 0 && buffer.Length > 0;
        length = unchecked(length + (uint)count);
        return count;
    }

    public override void Flush()
    {
    }

    public override long Seek(long offset, SeekOrigin origin) => throw new NotSupportedException();

    public override void SetLength(long value) => throw new NotSupportedException();

    public override void Write(byte[] buffer, int offset, int count) => throw new NotSupportedException();

    protected override void Dispose(bool disposing)
    {
        if (disposing) content.Dispose();
        base.Dispose(disposing);
    }
}
