namespace PanelChoice.Data;

/// <summary>A temporary file of runs of rows, one after the other. Its name is gone as soon as the system allows, so that nothing can stay behind.</summary>
internal sealed class RunFile : IDisposable
{
    private readonly FileStream file;

    private RunFile(FileStream file) => this.file = file;

    /// <summary>Where each run begins and ends.</summary>
    public List<(long Start, long End)> Runs { get; } = [];

    /// <summary>Begins a file in the folder of another.</summary>
    /// <exception cref="DiskWriteException">It cannot be made.</exception>
    public static RunFile Beside(string other) => new(DiskWriteException.Guard(() =>
    {
        var path = Path.Combine(Path.GetDirectoryName(other)!, $".{Path.GetFileName(other)}.{Guid.NewGuid():N}.rows");
        var made = new FileStream(path, FileMode.CreateNew, FileAccess.ReadWrite, FileShare.None, 1 << 18, FileOptions.DeleteOnClose);
        // A file that is open needs no name here: without one it goes with the process, however that ends.
        if (!OperatingSystem.IsWindows()) File.Delete(path);
        return made;
    }));

    /// <summary>Bytes that are free for files in a folder; the largest number where the system does not tell.</summary>
    public static long FreeBytes(string folder)
    {
        try
        {
            return new DriveInfo(OperatingSystem.IsWindows() ? Path.GetPathRoot(folder)! : folder).AvailableFreeSpace;
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException or ArgumentException)
        {
            // Some network drives do not say; the writing itself will.
            return long.MaxValue;
        }
    }

    /// <summary>Begins a run.</summary>
    public void BeginRun() => Runs.Add((file.Position, file.Position));

    /// <summary>Adds a row to the run.</summary>
    /// <exception cref="DiskWriteException">It cannot be written.</exception>
    public void Write(ReadOnlySpan<byte> row)
    {
        try
        {
            file.Write(row);
        }
        catch (IOException e)
        {
            throw new DiskWriteException(e);
        }
    }

    /// <summary>Ends the run.</summary>
    /// <exception cref="DiskWriteException">It cannot be written.</exception>
    public void EndRun()
    {
        DiskWriteException.Guard(() =>
        {
            file.Flush();
            return file;
        });
        Runs[^1] = (Runs[^1].Start, file.Position);
    }

    /// <summary>Fills a buffer from a place.</summary>
    /// <exception cref="DiskWriteException">It cannot be read back.</exception>
    public void Read(Span<byte> into, long at)
    {
        try
        {
            while (into.Length > 0)
            {
                var read = RandomAccess.Read(file.SafeFileHandle, into, at);
                if (read == 0) throw new EndOfStreamException("a temporary file ends before it should");
                into = into[read..];
                at += read;
            }
        }
        catch (IOException e)
        {
            throw new DiskWriteException(e);
        }
    }

    /// <summary>Closes and removes the file.</summary>
    public void Dispose()
    {
        // What could not be written any more is wanted by nobody.
        try
        {
            file.Dispose();
        }
        catch (IOException)
        {
            file.SafeFileHandle.Dispose();
        }
    }
}

/// <summary>Reads a run of a file row by row, through a buffer.</summary>
internal sealed class RunReader(RunFile file, int run, Memory<byte> buffer, int rowBytes)
{
    private readonly long end = file.Runs[run].End;
    private long at = file.Runs[run].Start;
    private int place;
    private int filled;

    /// <summary>The row that <see cref="Advance"/> came to.</summary>
    public ReadOnlySpan<byte> Row => buffer.Span.Slice(place - rowBytes, rowBytes);

    /// <summary>Goes on to the next row; false at the end.</summary>
    public bool Advance()
    {
        if (place == filled)
        {
            filled = (int)Math.Min(buffer.Length, end - at);
            place = 0;
            if (filled == 0) return false;
            file.Read(buffer.Span[..filled], at);
            at += filled;
        }

        place += rowBytes;
        return true;
    }
}
