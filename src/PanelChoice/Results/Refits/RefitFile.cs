using System.Buffers.Binary;
using System.Globalization;
using PanelChoice.Estimation;
using PanelChoice.Inference;

namespace PanelChoice.Results.Refits;

/// <summary>What was read of a file of refits: a part, or the journal of a run.</summary>
/// <param name="Path">The file.</param>
/// <param name="Header">Its header; null where not even that could be read.</param>
/// <param name="Outcomes">The refits in it.</param>
/// <param name="ValidLength">Bytes up to the last good record, the one that ends the file apart.</param>
/// <param name="Seal">The seal of that record.</param>
/// <param name="IsComplete">Whether it is closed with an end, as a part that is done is.</param>
/// <param name="Foreign">Why it is no file of this kind; null when it is one.</param>
/// <param name="Damage">What is wrong after <paramref name="ValidLength"/>; null when nothing is, also when the file merely has no end yet.</param>
internal sealed record RefitFile(
    string Path, RefitHeader? Header, IReadOnlyDictionary<(RefitSeries Series, int Number), RefitOutcome> Outcomes, long ValidLength,
    byte[] Seal, bool IsComplete, string? Foreign, string? Damage)
{
    /// <summary>Ending of a part that is done.</summary>
    public const string Done = ".refits";

    /// <summary>Ending of a part that is being made, or was left before it was done.</summary>
    public const string Unfinished = ".unfinished";

    /// <summary>Whether it is <see cref="Foreign"/> because it was written in another layout of this kind of file.</summary>
    public bool IsOfAnotherLayout { get; private init; }

    /// <summary>File name of a part, in an order that sorts.</summary>
    /// <param name="share">Which part.</param>
    /// <param name="ending">Its ending.</param>
    public static string NameOf(RefitShare share, string ending)
    {
        var parts = share.Parts.ToString(CultureInfo.InvariantCulture);
        return $"part-{share.Part.ToString(CultureInfo.InvariantCulture).PadLeft(parts.Length, '0')}-of-{parts}{ending}";
    }

    /// <summary>Reads a file of refits as far as it is good.</summary>
    /// <param name="path">The file.</param>
    /// <exception cref="IOException">It cannot be read, or another process is at work on it.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be read.</exception>
    public static RefitFile Read(string path)
    {
        using var stream = new FileStream(path, FileMode.Open, FileAccess.Read, FileShare.Read, 1 << 16);
        return Read(path, stream);
    }

    /// <summary>Reads a file of refits from a stream that stands at its beginning.</summary>
    public static RefitFile Read(string path, Stream stream)
    {
        var outcomes = new Dictionary<(RefitSeries, int), RefitOutcome>();
        var file = new RefitFile(path, null, outcomes, 0, [], false, null, null);
        var layout = new byte[RefitRecords.Layout.Length];
        var read = stream.ReadAtLeast(layout, layout.Length, throwOnEndOfStream: false);
        // Zeros are what a machine that failed may leave where it had no time to write.
        var start = layout.AsSpan(0, read).TrimEnd((byte)0);
        if (start.Length < layout.Length && RefitRecords.Layout.StartsWith(start)) return file with { Damage = "it breaks off in its first line" };
        if (!RefitRecords.Layout.SequenceEqual(layout)) return Stranger(file, System.Text.Encoding.Latin1.GetString(layout, 0, read));

        file = file with { ValidLength = read, Seal = RefitRecords.FirstSeal() };
        while (true)
        {
            var content = Next(stream, file.Seal, out var seal, out var damage);
            if (content is null) return file with { Damage = damage ?? (file.Header is null ? "it breaks off before its header" : null) };
            var length = 4 + content.Length + seal.Length;
            switch (((RefitRecordKind)content[0], file.Header))
            {
                case (RefitRecordKind.Header, null) when RefitHeader.FromJson(content.AsMemory(1)) is { } header:
                    file = file with { Header = header, ValidLength = file.ValidLength + length, Seal = seal };
                    continue;
                case (RefitRecordKind.Bootstrap or RefitRecordKind.Jackknife, { } header)
                    when RefitRecords.Read(content, header.Origin.Parameters) is { } refit && header.Holds(refit.Series, refit.Number):
                    if (!outcomes.TryAdd((refit.Series, refit.Number), refit.Outcome)) break;
                    file = file with { ValidLength = file.ValidLength + length, Seal = seal };
                    continue;
                case (RefitRecordKind.End, { } header) when content.Length == 1 && outcomes.Count == header.Replicates + header.Deletions:
                    return file with { IsComplete = true, Damage = stream.ReadByte() < 0 ? null : "it goes on after its end" };
            }

            return file with { Damage = $"the record after byte {file.ValidLength} makes no sense" };
        }
    }

    /// <summary>The content of the next record; null at the end, or with what is wrong.</summary>
    private static byte[]? Next(Stream stream, byte[] before, out byte[] seal, out string? damage)
    {
        seal = new byte[RefitRecords.SealBytes];
        damage = null;
        var four = new byte[4];
        var read = stream.ReadAtLeast(four, four.Length, throwOnEndOfStream: false);
        if (read == 0) return null;
        var bytes = BinaryPrimitives.ReadInt32LittleEndian(four);
        damage = "it breaks off inside a record";
        if (read < four.Length) return null;
        if (bytes is < 1 or > RefitRecords.MostBytes)
        {
            damage = "a record has a length without sense";
            return null;
        }

        var content = new byte[bytes];
        if (stream.ReadAtLeast(content, bytes, throwOnEndOfStream: false) < bytes
            || stream.ReadAtLeast(seal, seal.Length, throwOnEndOfStream: false) < seal.Length) return null;
        damage = "a checksum does not agree";
        if (!seal.AsSpan().SequenceEqual(RefitRecords.Seal(before, content))) return null;
        damage = null;
        return content;
    }

    private static RefitFile Stranger(RefitFile file, string start) => start.StartsWith(RefitRecords.Family, StringComparison.Ordinal)
        ? file with { Foreign = $"it has the layout {start.Split('\n')[0]}, which this version does not read", IsOfAnotherLayout = true }
        : file with { Foreign = "it is not a file of refits" };
}
