using System.Buffers.Binary;
using System.Security.Cryptography;
using System.Text;
using PanelChoice.Estimation;
using PanelChoice.Inference;

namespace PanelChoice.Results.Refits;

/// <summary>What a record of a file of refits is.</summary>
internal enum RefitRecordKind : byte
{
    /// <summary>The first: the header, as JSON.</summary>
    Header = 1,

    /// <summary>A bootstrap replicate.</summary>
    Bootstrap = 2,

    /// <summary>A refit without one cluster.</summary>
    Jackknife = 3,

    /// <summary>The last of a part that is done: everything is there. The journal of a run never has one.</summary>
    End = 4,
}

/// <summary>
/// The bytes of a file of refits: one line that names the layout, then records. A record is its length (4 bytes, of its content alone), its content
/// (first byte: what it is), and a seal of 32 bytes, the SHA-256 over the seal before it and the content. A seal therefore vouches for everything
/// up to it, and the last one for the whole file; what breaks off or was changed is seen at the first record that it touches. All numbers are
/// little-endian, floating-point numbers are stored as their bits.
/// </summary>
internal static class RefitRecords
{
    /// <summary>The line that every layout begins with.</summary>
    public const string Family = "panelchoice-refits/";

    /// <summary>Longest content that is read: far more than any model has parameters.</summary>
    public const int MostBytes = 1 << 24;

    /// <summary>Length of a seal.</summary>
    public const int SealBytes = SHA256.HashSizeInBytes;

    /// <summary>The line that names this layout, with its line feed.</summary>
    public static ReadOnlySpan<byte> Layout => "panelchoice-refits/1\n"u8;

    /// <summary>The seal before the first record.</summary>
    public static byte[] FirstSeal() => SHA256.HashData(Layout);

    /// <summary>The seal of a record.</summary>
    /// <param name="before">The seal before it.</param>
    /// <param name="content">Its content.</param>
    public static byte[] Seal(ReadOnlySpan<byte> before, ReadOnlySpan<byte> content)
    {
        using var hash = IncrementalHash.CreateHash(HashAlgorithmName.SHA256);
        hash.AppendData(before);
        hash.AppendData(content);
        return hash.GetHashAndReset();
    }

    /// <summary>Writes one record and gives its seal.</summary>
    public static byte[] Write(Stream stream, ReadOnlySpan<byte> before, ReadOnlySpan<byte> content)
    {
        var seal = Seal(before, content);
        Span<byte> length = stackalloc byte[4];
        BinaryPrimitives.WriteInt32LittleEndian(length, content.Length);
        stream.Write(length);
        stream.Write(content);
        stream.Write(seal);
        return seal;
    }

    /// <summary>The content of a header's record.</summary>
    public static byte[] Of(RefitHeader header) => [(byte)RefitRecordKind.Header, .. header.ToJson()];

    /// <summary>The content of the last record.</summary>
    public static byte[] End() => [(byte)RefitRecordKind.End];

    /// <summary>The content of a refit's record.</summary>
    public static byte[] Of(RefitSeries series, int number, RefitOutcome outcome)
    {
        using var bytes = new MemoryStream();
        using var writer = new BinaryWriter(bytes, Encoding.UTF8);
        writer.Write((byte)(series == RefitSeries.Bootstrap ? RefitRecordKind.Bootstrap : RefitRecordKind.Jackknife));
        writer.Write(number);
        writer.Write((byte)outcome.Status);
        writer.Write(outcome.Retried);
        writer.Write(outcome.Iterations);
        writer.Write(outcome.LogLikelihood);
        writer.Write(outcome.Decrement);
        writer.Write(outcome.Parameters.Length);
        foreach (var value in outcome.Parameters) writer.Write(value);
        writer.Write(outcome.FailureKind is not null);
        if (outcome.FailureKind is { } kind) writer.Write(kind);
        writer.Write(outcome.FailedParameters.Length);
        foreach (var parameter in outcome.FailedParameters) writer.Write(parameter);
        writer.Flush();
        return bytes.ToArray();
    }

    /// <summary>A refit from the content of its record; null where it makes no sense.</summary>
    /// <param name="content">The content.</param>
    /// <param name="parameters">Number of parameters of the model.</param>
    public static (RefitSeries Series, int Number, RefitOutcome Outcome)? Read(byte[] content, int parameters)
    {
        using var reader = new BinaryReader(new MemoryStream(content), Encoding.UTF8);
        try
        {
            var series = (RefitRecordKind)reader.ReadByte() == RefitRecordKind.Bootstrap ? RefitSeries.Bootstrap : RefitSeries.Jackknife;
            var number = reader.ReadInt32();
            var status = (FitStatus)reader.ReadByte();
            var retried = reader.ReadBoolean();
            var iterations = reader.ReadInt32();
            var logLikelihood = reader.ReadDouble();
            var decrement = reader.ReadDouble();
            var values = new double[Count(reader, parameters)];
            for (var k = 0; k < values.Length; k++) values[k] = reader.ReadDouble();
            var kind = reader.ReadBoolean() ? reader.ReadString() : null;
            var failed = new int[Count(reader, int.MaxValue)];
            for (var i = 0; i < failed.Length; i++) failed[i] = reader.ReadInt32();
            var fits = Enum.IsDefined(status) && (values.Length == parameters || (values.Length == 0 && status != FitStatus.Converged))
                && failed.All(k => k >= 0 && k < parameters) && reader.BaseStream.Position == content.Length;
            return fits
                ? (series, number, new RefitOutcome(status, [.. values], logLikelihood, iterations, retried, kind, [.. failed]) { Decrement = decrement })
                : null;
        }
        catch (Exception senseless) when (senseless is EndOfStreamException or FormatException or IOException)
        {
            return null;
        }

        // A number of entries that the content cannot hold would only ask for memory.
        static int Count(BinaryReader reader, int most) =>
            reader.ReadInt32() is var n && n >= 0 && n <= most && n <= reader.BaseStream.Length - reader.BaseStream.Position ? n : throw new FormatException();
    }
}
