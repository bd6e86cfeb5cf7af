namespace PanelChoice.Results;

/// <summary>
/// Writes a file so that it is either wholly there or not there at all: into a temporary name in the same folder, flushed to the disk, then
/// renamed over the old file. After a failure the old file is untouched and the temporary one is gone.
/// </summary>
internal static class AtomicFile
{
    /// <summary>Writes a file.</summary>
    /// <param name="path">The file to make or replace; its folder must exist.</param>
    /// <param name="write">Writes the whole content; it may leave the stream open or close it.</param>
    /// <exception cref="IOException">The folder does not exist, the disk is full, the path is a folder.</exception>
    /// <exception cref="UnauthorizedAccessException">The folder or the old file may not be written.</exception>
    public static void Write(string path, Action<Stream> write)
    {
        ArgumentException.ThrowIfNullOrEmpty(path);
        ArgumentNullException.ThrowIfNull(write);
        var full = Path.GetFullPath(path);
        var temporary = Path.Combine(
            Path.GetDirectoryName(full) ?? throw new IOException($"'{path}' is not a file name."),
            $".{Path.GetFileName(full)}.{Path.GetRandomFileName()}.part");
        try
        {
            using (var stream = new FileStream(temporary, FileMode.CreateNew, FileAccess.ReadWrite, FileShare.None, 1 << 16))
            {
                write(stream);
            }

            FlushToDisk(temporary);
            File.Move(temporary, full, overwrite: true);
        }
        catch
        {
            File.Delete(temporary);
            throw;
        }
    }

    // Opened anew, because a writer that owns the stream may have closed it.
    private static void FlushToDisk(string path)
    {
        using var stream = new FileStream(path, FileMode.Open, FileAccess.Write, FileShare.None);
        stream.Flush(flushToDisk: true);
    }
}
