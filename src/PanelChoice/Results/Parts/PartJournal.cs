using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Results.Parts;

/// <summary>
/// A part while it is being made: refits are added to the unfinished file as they are done, so that a process that is ended at any moment
/// loses at most those it was at work on. The same call on the same folder goes on from there. The file takes its final
/// name only when everything is in it. One process at a time can have it open.
/// </summary>
internal sealed class PartJournal : IRefitJournal, IDisposable
{
    private readonly Dictionary<(RefitSeries Series, int Number), RefitOutcome> outcomes;
    private readonly FileStream? stream;
    private readonly string folder;
    private readonly RefitShare share;
    private byte[] seal;

    private PartJournal(string folder, PartFile file, FileStream? stream, RefitShare share)
    {
        (this.folder, this.stream, this.share) = (folder, stream, share);
        seal = file.Seal;
        outcomes = new Dictionary<(RefitSeries, int), RefitOutcome>(file.Outcomes);
        Found = outcomes.Count;
    }

    /// <summary>Refits that were there already.</summary>
    public int Found { get; }

    /// <summary>Whether the part was complete already.</summary>
    public bool WasComplete => stream is null;

    /// <summary>What a file of the same name was wrong with, so that it does not count; null when nothing was.</summary>
    public string? Replaces { get; private init; }

    /// <summary>The file that the part ends as.</summary>
    public string File => Path.Combine(folder, PartFile.NameOf(share, PartFile.Done));

    /// <summary>A part that is complete and whole; null where there is none.</summary>
    /// <param name="folder">The folder of the parts.</param>
    /// <param name="share">Which part.</param>
    /// <exception cref="IOException">It cannot be read.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be read.</exception>
    public static PartFile? Finished(string folder, RefitShare share)
    {
        var path = Path.Combine(folder, PartFile.NameOf(share, PartFile.Done));
        return System.IO.File.Exists(path) && Exclusively(share, () => PartFile.Read(path)) is { IsComplete: true, Damage: null } file && file.Header?.Share == share ? file : null;
    }

    /// <summary>Opens a part: as it stands when it is complete, to go on when it is not, new when there is none.</summary>
    /// <param name="folder">The folder of the parts; it must exist.</param>
    /// <param name="header">What the part says of itself.</param>
    /// <returns>The part, or why a file that stands in its place must not be touched.</returns>
    /// <exception cref="IOException">It cannot be written, or another process is at work on it.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be written.</exception>
    public static Checked<PartJournal> Open(string folder, PartHeader header)
    {
        var done = Path.Combine(folder, PartFile.NameOf(header.Share, PartFile.Done));
        var path = Path.Combine(folder, PartFile.NameOf(header.Share, PartFile.Unfinished));
        string? replaces = null;
        if (System.IO.File.Exists(done))
        {
            var file = Exclusively(header.Share, () => PartFile.Read(done));
            if (WhyKept(file, header) is { } problem) return Checked<PartJournal>.Bad([problem]);
            if (file is { IsComplete: true, Damage: null }) return Checked<PartJournal>.Good(new PartJournal(folder, file, null, header.Share));
            replaces = $"{done} is damaged ({file.Damage ?? "it has no end"}) and is made again.";
        }

        var stream = Exclusively(header.Share, () => new FileStream(path, FileMode.OpenOrCreate, FileAccess.ReadWrite, FileShare.None, 1 << 16));
        try
        {
            // Between the two looks another run may have finished the part, and what is open now may be its very file under its final name.
            var isGone = !System.IO.File.Exists(path);
            if (isGone || (replaces is null && System.IO.File.Exists(done)))
            {
                if (!isGone && stream.Length == 0 && !OperatingSystem.IsWindows()) System.IO.File.Delete(path);
                stream.Dispose();
                return Open(folder, header);
            }

            var file = PartFile.Read(path, stream);
            if (WhyKept(file, header) is { } problem)
            {
                stream.Dispose();
                return Checked<PartJournal>.Bad([problem]);
            }

            // What broke off is cut back to what is good.
            stream.SetLength(file.Header is null ? 0 : file.ValidLength);
            stream.Seek(0, SeekOrigin.End);
            if (file.Header is null)
            {
                stream.Write(PartRecords.Layout);
                file = file with { Seal = PartRecords.Write(stream, PartRecords.FirstSeal(), PartRecords.Of(header)) };
                stream.Flush(flushToDisk: true);
            }

            return Checked<PartJournal>.Good(new PartJournal(folder, file, stream, header.Share) { Replaces = replaces });
        }
        catch
        {
            stream.Dispose();
            throw;
        }
    }

    /// <inheritdoc/>
    public RefitOutcome? Find(RefitSeries series, int number) => outcomes.GetValueOrDefault((series, number));

    /// <inheritdoc/>
    public void Keep(RefitSeries series, ImmutableArray<int> numbers, ImmutableArray<RefitOutcome> outcomes)
    {
        for (var i = 0; i < numbers.Length; i++)
        {
            Append(series, numbers[i], outcomes[i]);
            this.outcomes.Add((series, numbers[i]), outcomes[i]);
        }

        // To the system, which outlives this process. What a machine that fails takes away is seen by the seals and made again, and
        // waiting for the disk behind every batch can take longer than the batch.
        stream!.Flush();
    }

    /// <summary>Closes the part with its end and gives it its final name.</summary>
    public void Complete()
    {
        if (stream is null) return;
        PartRecords.Write(stream, seal, PartRecords.End());
        stream.Flush(flushToDisk: true);
        // Where an open file can be renamed it keeps its lock until it has its name, so that no other run takes it for unfinished.
        if (OperatingSystem.IsWindows()) stream.Dispose();
        System.IO.File.Move(stream.Name, File, overwrite: true);
        stream.Dispose();
    }

    /// <inheritdoc/>
    public void Dispose() => stream?.Dispose();

    private void Append(RefitSeries series, int number, RefitOutcome outcome) =>
        seal = PartRecords.Write(stream!, seal, PartRecords.Of(series, number, outcome));

    /// <summary>Why a file that stands in a part's place must stay as it is: it is something else, or made from something else.</summary>
    private static Problem? WhyKept(PartFile file, PartHeader header)
    {
        if (file.Foreign is { } reason)
            return new Problem("parts.foreign", file.Path, reason, "move it away, or name another folder with --out");
        if (file.Header is not { } there || (there.Origin == header.Origin && there.Share == header.Share)) return null;
        var what = header.Origin.Against(there.Origin) is { } difference
            ? $"it was made from something else and differs in {difference.Words}"
            : $"it holds part {there.Share.Part} of {there.Share.Parts}";
        return new Problem("parts.other_origin", file.Path, what, "delete it if it is out of date, or name another folder with --out");
    }

    /// <summary>Opens something, or says that another run has it.</summary>
    private static T Exclusively<T>(RefitShare share, Func<T> open)
    {
        try
        {
            return open();
        }
        catch (IOException busy) when (FileLocks.IsTaken(busy))
        {
            throw new IOException($"another run is at work on part {share.Part} of {share.Parts}; wait until it has ended.", busy);
        }
    }
}
