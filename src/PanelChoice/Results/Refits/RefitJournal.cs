using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Inference;

namespace PanelChoice.Results.Refits;

/// <summary>
/// A file of refits that is only added to: refits are in it as soon as they are done, so that a process that is ended at any moment loses at most
/// those it was at work on. One process at a time can have it open. What it held when it was opened is read, and left as it is until
/// <see cref="Begin"/> or <see cref="GoOn"/>.
/// </summary>
internal sealed class RefitJournal : IRefitJournal, IDisposable
{
    private readonly FileStream stream;
    private readonly DiskSync sync;
    private Dictionary<(RefitSeries Series, int Number), RefitOutcome> outcomes = [];
    private byte[] seal = [];
    private long length;

    private RefitJournal(FileStream stream, RefitFile content)
    {
        (this.stream, Content) = (stream, content);
        sync = DiskSync.Of(stream);
    }

    /// <summary>What it held when it was opened.</summary>
    public RefitFile Content { get; }

    /// <summary>The file.</summary>
    public string Path => stream.Name;

    /// <summary>Series and numbers of the refits in it now.</summary>
    public IReadOnlyCollection<(RefitSeries Series, int Number)> Kept => outcomes.Keys;

    /// <summary>Opens a file, or makes it, for this process alone.</summary>
    /// <param name="path">The file; its folder must exist.</param>
    /// <param name="busy">What to say where another process has it open.</param>
    /// <exception cref="IOException">It cannot be written, or another process has it open.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be written.</exception>
    public static RefitJournal Open(string path, string busy)
    {
        // Without a buffer of its own: a batch is written at once, and what could not be written is not tried again behind one's back.
        var stream = FileLocks.Exclusively(busy, () => new FileStream(path, FileMode.OpenOrCreate, FileAccess.ReadWrite, FileShare.None, bufferSize: 0));
        try
        {
            return new RefitJournal(stream, RefitFile.Read(path, new BufferedStream(stream, 1 << 16)));
        }
        catch
        {
            stream.Dispose();
            throw;
        }
    }

    /// <summary>Begins anew, whatever was in the file.</summary>
    /// <param name="header">What it says of itself.</param>
    /// <exception cref="IOException">It cannot be written.</exception>
    public void Begin(RefitHeader header)
    {
        stream.SetLength(length = 0);
        outcomes = [];
        using var bytes = new MemoryStream();
        bytes.Write(RefitRecords.Layout);
        var next = RefitRecords.Write(bytes, RefitRecords.FirstSeal(), RefitRecords.Of(header));
        Append(bytes);
        seal = next;
        stream.Flush(flushToDisk: true);
    }

    /// <summary>Goes on behind what is good: what broke off at the end is cut away. Where not even a header is there, it begins.</summary>
    /// <param name="header">What it says of itself.</param>
    /// <exception cref="IOException">It cannot be written.</exception>
    public void GoOn(RefitHeader header)
    {
        if (Content.Header is null)
        {
            Begin(header);
            return;
        }

        stream.SetLength(length = Content.ValidLength);
        seal = Content.Seal;
        outcomes = new Dictionary<(RefitSeries, int), RefitOutcome>(Content.Outcomes);
    }

    /// <inheritdoc/>
    public RefitOutcome? Find(RefitSeries series, int number) => outcomes.GetValueOrDefault((series, number));

    /// <inheritdoc/>
    public void Keep(RefitSeries series, ImmutableArray<int> numbers, ImmutableArray<RefitOutcome> outcomes)
    {
        using var bytes = new MemoryStream();
        var next = seal;
        for (var i = 0; i < numbers.Length; i++) next = RefitRecords.Write(bytes, next, RefitRecords.Of(series, numbers[i], outcomes[i]));
        Append(bytes);
        seal = next;
        for (var i = 0; i < numbers.Length; i++) this.outcomes.Add((series, numbers[i]), outcomes[i]);
        sync.Written();
        RunEvents.Log.RefitsKept(Path, this.outcomes.Count);
    }

    /// <summary>Closes the content with its end and sees it onto the disk.</summary>
    /// <exception cref="IOException">It cannot be written.</exception>
    public void End()
    {
        using var bytes = new MemoryStream();
        RefitRecords.Write(bytes, seal, RefitRecords.End());
        Append(bytes);
        stream.Flush(flushToDisk: true);
    }

    /// <inheritdoc/>
    public void Dispose() => stream.Dispose();

    /// <summary>Writes to the end, or leaves the file as it was.</summary>
    private void Append(MemoryStream bytes)
    {
        try
        {
            stream.Position = length;
            stream.Write(bytes.GetBuffer().AsSpan(0, (int)bytes.Length));
        }
        catch (IOException)
        {
            CutBack();
            throw;
        }
        catch (ArgumentOutOfRangeException tooLong)
        {
            // So the runtime puts it when the file may not grow any more: a limit on its size, for example of a user, is reached.
            CutBack();
            throw new IOException("the file may not grow any more.", tooLong);
        }

        length += bytes.Length;
    }

    private void CutBack()
    {
        try
        {
            stream.SetLength(length);
        }
        catch (IOException)
        {
            // What stopped the writing is told by who called; a record that was left in halves is known by its seal when the file is next read.
        }
    }
}
