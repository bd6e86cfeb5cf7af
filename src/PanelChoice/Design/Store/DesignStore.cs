using System.Collections.Immutable;
using Microsoft.Win32.SafeHandles;
using PanelChoice.Covariates;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Design.Store;

/// <summary>
/// A built sample that is kept in one file: the design of the study's terms, a second design on the same sample, and all that later stages know of the
/// sample. It stays open while its designs are in use.
/// </summary>
internal sealed class DesignStore : IDisposable
{
    private readonly SafeFileHandle file;

    private DesignStore(SafeFileHandle file, string path, EstimationSample sample, ChoiceDesign main, ChoiceDesign? second, ImmutableArray<string> secondNames)
    {
        this.file = file;
        File = path;
        Sample = sample;
        Main = main;
        Second = second;
        SecondNames = secondNames;
    }

    /// <summary>The store's file, as it was named.</summary>
    public string File { get; }

    /// <summary>The sample.</summary>
    public EstimationSample Sample { get; }

    /// <summary>Design of the study's terms.</summary>
    public ChoiceDesign Main { get; }

    /// <summary>Design of other terms; null where there is none.</summary>
    public ChoiceDesign? Second { get; }

    /// <summary>Names that belong to the second design.</summary>
    public ImmutableArray<string> SecondNames { get; }

    /// <summary>
    /// Opens a store, reads it once from end to end, and refuses it where it is damaged, of another version, or made for another study or other data.
    /// The data count as the same where size and time of the file are, or else where its bytes are.
    /// </summary>
    /// <param name="path">The file.</param>
    /// <param name="study">The study.</param>
    /// <param name="bytesHeld">Bytes of blocks that may be held in memory, for a design without them.</param>
    /// <returns>
    /// The store, or the problem: <c>store.unreadable</c>, <c>store.not_a_store</c>, <c>store.other_version</c>, <c>store.damaged</c>,
    /// <c>store.other_study</c>, <c>store.other_data</c>, <c>data.not_found</c>.
    /// </returns>
    public static Checked<DesignStore> Open(string path, StudySpecification study, Func<ChoiceDesign, long> bytesHeld)
    {
        var file = (SafeFileHandle?)null;
        try
        {
            file = System.IO.File.OpenHandle(path, FileMode.Open, FileAccess.Read, FileShare.Read | FileShare.Delete);
            var opened = Open(file, path, study, bytesHeld);
            if (opened.Value is not null) file = null;
            return opened;
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            return Refuse(path, "store.unreadable", $"the store cannot be read ({e.Message.TrimEnd('.')})", "check the disk and the rights, or name another file");
        }
        finally
        {
            file?.Dispose();
        }
    }

    /// <inheritdoc/>
    public void Dispose() => file.Dispose();

    private static Checked<DesignStore> Open(SafeFileHandle file, string path, StudySpecification study, Func<ChoiceDesign, long> bytesHeld)
    {
        const string Again = "delete the store, and it is made anew";
        var damaged = () => Refuse(path, "store.damaged", "the store is damaged or was cut off", Again);
        var length = RandomAccess.GetLength(file);
        var start = new byte[StorePreamble.Bytes];
        FileBlockStore.ReadExactly(file, start.AsSpan(0, (int)Math.Min(length, start.Length)), 0);
        if (!StorePreamble.IsStore(start))
            return Refuse(path, "store.not_a_store", "the file is no store of a design", "name another file: this one is not overwritten");
        if (StorePreamble.VersionOf(start) is var version && version != StorePreamble.Version)
            return Refuse(path, "store.other_version", $"the store has version {version} of its layout, and this program writes and reads version {StorePreamble.Version}", Again);
        if (StorePreamble.Read(start) is not { } preamble || preamble.HeaderAt < StorePreamble.Bytes || preamble.HeaderBytes < 0
            || preamble.HeaderAt + preamble.HeaderBytes != length) return damaged();
        if (HeaderOf(path, preamble) is not { } header) return damaged();

        if (header.Origin.Study != DesignFingerprint.Of(study))
            return Refuse(
                path, "store.other_study", "the store was made for a study with another panel, history rule, nests, terms, form or cluster than this one has now",
                "delete it, or name another file for this study");
        if (!System.IO.File.Exists(study.Panel.FullPath))
            return Checked<DesignStore>.Bad([new Problem("data.not_found", study.Panel.File, "there is no such file", $"check [panel] file; it was looked for at {study.Panel.FullPath}")]);
        if (!header.Origin.IsOf(study))
            return Refuse(path, "store.other_data", $"the data file {study.Panel.File} is not what it was when the store was made", Again);
        var tree = NestTreeBuilder.Build(study, [.. header.Sample.Alternatives.Select(a => a.Name)]);
        if (tree.Value is not { } nests) return Checked<DesignStore>.Bad(tree.Problems);

        var blocks = header.Blocks();
        if (DesignOf(file, header, header.Main, nests, blocks, bytesHeld) is not { } main) return damaged();
        var second = header.Second is null ? null : DesignOf(file, header, header.Second, nests, blocks, _ => 0);
        return header.Second is not null && second is null
            ? damaged()
            : Checked<DesignStore>.Good(new DesignStore(file, path, header.Sample, main, second, header.SecondNames));
    }

    private static StoreHeader? HeaderOf(string path, StorePreamble preamble)
    {
        using var stream = System.IO.File.OpenRead(path);
        stream.Position = preamble.HeaderAt;
        if (StorePreamble.ChecksumOf(stream, preamble.HeaderBytes) != preamble.HeaderChecksum) return null;
        stream.Position = preamble.HeaderAt;
        try
        {
            using var reader = new BinaryReader(stream, System.Text.Encoding.UTF8, leaveOpen: true);
            return StoreHeader.Read(reader);
        }
        catch (Exception e) when (e is EndOfStreamException or InvalidDataException)
        {
            return null;
        }
    }

    /// <summary>A design, each of whose blocks was read and found whole; null where one is not.</summary>
    private static ChoiceDesign? DesignOf(
        SafeFileHandle file, StoreHeader header, StoredDesign stored, NestTree tree, ImmutableArray<DesignBlock> blocks, Func<ChoiceDesign, long> bytesHeld)
    {
        var held = new MemoryBlockStore(stored.Format);
        var design = new ChoiceDesign(
            tree, stored.Layout, stored.Columns, blocks, new FileBlockStore(stored.Format, file, stored.FirstByte, blocks, held),
            header.PersonStart, header.PersonWeight, header.ClusterBy, header.ClusterOf, header.Clusters);
        var offset = FileBlockStore.Offsets(stored.Format, stored.FirstByte, blocks);
        if (stored.Checksums.Length != blocks.Length) return null;
        var mostHeld = bytesHeld(design);
        var buffer = Array.Empty<byte>();
        for (var b = 0; b < blocks.Length; b++)
        {
            var bytes = (int)(offset[b + 1] - offset[b]);
            if (buffer.Length < bytes) buffer = new byte[bytes];
            var block = buffer.AsSpan(0, bytes);
            FileBlockStore.ReadExactly(file, block, offset[b]);
            if (Checksum.Of(block) != stored.Checksums[b]) return null;
            if (held.Count == b && held.Bytes + bytes <= mostHeld) block.CopyTo(held.Append(blocks[b].Lanes));
        }

        return design;
    }

    private static Checked<DesignStore> Refuse(string path, string id, string what, string remedy) =>
        Checked<DesignStore>.Bad([new Problem(id, path, what, remedy)]);
}
