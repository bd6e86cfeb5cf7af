namespace PanelChoice.Results;

/// <summary>
/// Writes output files so that a reader sees the old file or the whole new one, never a part: everything goes to a temporary name in the
/// same folder, is flushed to the disk, and is renamed at the end. After a failure the temporary files are gone and the old files stand.
/// </summary>
internal static class AtomicFile
{
    private const string Ending = ".part";

    /// <summary>Writes one file.</summary>
    /// <param name="path">The file to make or replace; its folder must exist.</param>
    /// <param name="write">Writes the whole content; it may leave the stream open or close it.</param>
    /// <exception cref="IOException">The folder does not exist, the disk is full, the path is a folder.</exception>
    /// <exception cref="UnauthorizedAccessException">The folder or the old file may not be written.</exception>
    public static void Write(string path, Action<Stream> write) => WriteAll([new PlannedFile(path, write)]);

    /// <summary>Writes several files that belong together: none takes its place before all are complete.</summary>
    /// <param name="files">The files.</param>
    /// <exception cref="IOException">As for one file.</exception>
    /// <exception cref="UnauthorizedAccessException">As for one file.</exception>
    public static void WriteAll(IReadOnlyList<PlannedFile> files)
    {
        ArgumentNullException.ThrowIfNull(files);
        var temporary = files.Select(f => TemporaryName(f.Path)).ToList();
        try
        {
            for (var i = 0; i < files.Count; i++)
            {
                using (var stream = new FileStream(temporary[i], FileMode.CreateNew, FileAccess.ReadWrite, FileShare.None, 1 << 16))
                    files[i].Write(stream);
                FlushToDisk(temporary[i]);
                RunEvents.Log.FileWritten(files[i].Path);
            }

            // A folder in the way is seen now, while nothing has been replaced yet.
            if (files.FirstOrDefault(f => Directory.Exists(f.Path)) is { } blocked)
                throw new IOException($"'{blocked.Path}' is a folder.");
            for (var i = 0; i < files.Count; i++)
            {
                File.Move(temporary[i], files[i].Path, overwrite: true);
                RunEvents.Log.FileNamed(files[i].Path);
            }
        }
        finally
        {
            foreach (var name in temporary) File.Delete(name);
        }
    }

    /// <summary>Takes away temporary files that a process which was killed has left beside a file. Nobody may be writing that file.</summary>
    /// <param name="path">The file.</param>
    /// <exception cref="IOException">One cannot be taken away.</exception>
    /// <exception cref="UnauthorizedAccessException">One may not be taken away.</exception>
    public static void RemoveLeftovers(string path)
    {
        ArgumentException.ThrowIfNullOrEmpty(path);
        var full = Path.GetFullPath(path);
        var stem = $".{Path.GetFileName(full)}.";
        foreach (var file in Directory.EnumerateFiles(Path.GetDirectoryName(full)!, stem + "*" + Ending))
            if (Guid.TryParseExact(Path.GetFileName(file)[stem.Length..^Ending.Length], "N", out _)) File.Delete(file);
    }

    private static string TemporaryName(string path)
    {
        ArgumentException.ThrowIfNullOrEmpty(path);
        var full = Path.GetFullPath(path);
        var folder = Path.GetDirectoryName(full) ?? throw new IOException($"'{path}' is not a file name.");
        if (!Directory.Exists(folder)) throw new DirectoryNotFoundException($"The folder '{folder}' does not exist.");
        // Renaming onto a device would put a file in its place, for every program on the machine.
        if (!OperatingSystem.IsWindows() && folder == "/dev") throw new IOException("it lies among the devices; name an ordinary file.");
        return Path.Combine(folder, $".{Path.GetFileName(full)}.{Guid.NewGuid():N}{Ending}");
    }

    // Opened anew, because a writer that owns the stream may have closed it.
    private static void FlushToDisk(string path)
    {
        using var stream = new FileStream(path, FileMode.Open, FileAccess.Write, FileShare.None);
        stream.Flush(flushToDisk: true);
    }
}

/// <summary>A file to be written by <see cref="AtomicFile"/>.</summary>
/// <param name="Path">Where it shall stand.</param>
/// <param name="Write">Writes its bytes.</param>
internal sealed record PlannedFile(string Path, Action<Stream> Write);
