using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Numerics;

namespace PanelChoice.Design.Store;

/// <summary>
/// Writes a store under a temporary name beside its own and gives it its name once it is complete and on the disk. Blocks are written as they come; the
/// header, which is known last, stands at the end, and the first bytes of the file say where.
/// </summary>
internal sealed class StoreWriter : IDisposable
{
    private const string Ending = ".part";

    /// <summary>A file that nobody has open and nobody has written to for so long was left by a process that was killed.</summary>
    private static readonly TimeSpan LeastAge = TimeSpan.FromMinutes(1);

    private readonly string path;
    private readonly string temporary;
    private readonly FileStream file;

    /// <summary>Begins a store.</summary>
    /// <param name="path">The file to make or replace.</param>
    /// <exception cref="IOException">The file cannot be written.</exception>
    /// <exception cref="UnauthorizedAccessException">The file may not be written.</exception>
    public StoreWriter(string path)
    {
        this.path = Path.GetFullPath(path);
        var folder = Path.GetDirectoryName(this.path) ?? throw new IOException($"'{path}' is not a file name.");
        var stem = $".{Path.GetFileName(this.path)}.";
        RemoveLeftovers(folder, stem);
        temporary = Path.Combine(folder, $"{stem}{Guid.NewGuid():N}{Ending}");
        file = new FileStream(temporary, FileMode.CreateNew, FileAccess.ReadWrite, FileShare.Read, 1 << 16);
        file.Write(new byte[StorePreamble.Bytes]);
    }

    /// <summary>Begins the blocks of a design.</summary>
    /// <param name="format">How each is laid out.</param>
    public Section Begin(BlockFormat format) => new(file, format);

    /// <summary>Writes the header, and gives the file its name.</summary>
    public void Complete(StoreHeader header)
    {
        var begin = file.Position;
        using (var content = new BinaryWriter(file, System.Text.Encoding.UTF8, leaveOpen: true)) header.Write(content);
        var length = file.Position - begin;
        // The checksum is taken from what was written, piece by piece: a header grows with the number of persons.
        file.Position = begin;
        var preamble = new byte[StorePreamble.Bytes];
        new StorePreamble(begin, length, StorePreamble.ChecksumOf(file, length)).Write(preamble);
        file.Position = 0;
        file.Write(preamble);
        file.Flush(flushToDisk: true);
        file.Dispose();
        File.Move(temporary, path, overwrite: true);
    }

    /// <summary>Lets go of the file; without <see cref="Complete"/> nothing is left of it.</summary>
    public void Dispose()
    {
        file.Dispose();
        File.Delete(temporary);
    }

    /// <summary>Takes away what processes that were killed have left: as large as a store, and of no use to anybody.</summary>
    private static void RemoveLeftovers(string folder, string stem)
    {
        foreach (var file in Directory.EnumerateFiles(folder, stem + "*" + Ending))
        {
            if (!Guid.TryParseExact(Path.GetFileName(file)[stem.Length..^Ending.Length], "N", out _) || DateTime.UtcNow - File.GetLastWriteTimeUtc(file) < LeastAge) continue;
            try
            {
                using (new FileStream(file, FileMode.Open, FileAccess.ReadWrite, FileShare.None, 1, FileOptions.DeleteOnClose)) { }
            }
            catch (Exception refused) when (refused is IOException or UnauthorizedAccessException)
            {
                // Another run is writing it, or it is somebody else's: then it is theirs to take away.
            }
        }
    }

    /// <summary>The blocks of one design on their way into the file.</summary>
    internal sealed class Section : IBlockTarget
    {
        private readonly FileStream file;
        private readonly BlockFormat format;
        private readonly List<DesignBlock> blocks = [];
        private readonly ImmutableArray<uint>.Builder checksums = ImmutableArray.CreateBuilder<uint>();
        private byte[] open = [];
        private int length;

        public Section(FileStream file, BlockFormat format)
        {
            this.file = file;
            this.format = format;
            FirstByte = file.Position;
        }

        /// <summary>Where the first block begins.</summary>
        public long FirstByte { get; }

        /// <summary>How each block is laid out.</summary>
        public BlockFormat Format => format;

        /// <summary>The blocks as a store, once all are there.</summary>
        public BlockStore? Store { get; private set; }

        /// <summary>A design of these blocks as the header tells it.</summary>
        public StoredDesign Of(ChoiceDesign design) => new(design.Layout, design.Columns, format, FirstByte, checksums.ToImmutable());

        /// <inheritdoc/>
        public Span<byte> Append(int lanes)
        {
            Put();
            length = format.Bytes(lanes);
            if (open.Length < length) open = new byte[length];
            blocks.Add(new DesignBlock(blocks.Count, 0, 0, lanes));
            return open.AsSpan(0, length);
        }

        /// <inheritdoc/>
        public BlockStore Complete()
        {
            Put();
            file.Flush();
            Store = new FileBlockStore(format, file.SafeFileHandle, FirstByte, blocks, new MemoryBlockStore(format));
            return Store;
        }

        private void Put()
        {
            if (length == 0) return;
            var block = open.AsSpan(0, length);
            checksums.Add(Checksum.Of(block));
            try
            {
                file.Write(block);
            }
            catch (IOException e)
            {
                throw new DiskWriteException(e);
            }

            block.Clear();
            length = 0;
        }
    }
}
