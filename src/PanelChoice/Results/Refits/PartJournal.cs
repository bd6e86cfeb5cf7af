using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Results.Refits;

/// <summary>
/// A part while it is being made: a journal under the part's unfinished name. The same call on the same folder goes on from where it was left. The file takes its
/// final name only when everything is in it.
/// </summary>
internal sealed class PartJournal : IDisposable
{
    private readonly RefitJournal? journal;

    private PartJournal(string file, RefitJournal? journal, int found)
    {
        (File, this.journal, Found) = (file, journal, found);
    }

    /// <summary>Where refits are found and kept; null when the part was complete already.</summary>
    public IRefitJournal? Refits => journal;

    /// <summary>Refits that were there already.</summary>
    public int Found { get; }

    /// <summary>What a file of the same name was wrong with, so that it does not count; null when nothing was.</summary>
    public string? Replaces { get; private init; }

    /// <summary>The file that the part ends as.</summary>
    public string File { get; }

    /// <summary>A part that is complete and whole; null where there is none.</summary>
    /// <param name="folder">The folder of the parts.</param>
    /// <param name="share">Which part.</param>
    /// <exception cref="IOException">It cannot be read.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be read.</exception>
    public static RefitFile? Finished(string folder, RefitShare share)
    {
        var path = Path.Combine(folder, RefitFile.NameOf(share, RefitFile.Done));
        return System.IO.File.Exists(path) && Read(path, share) is { IsComplete: true, Damage: null } file && file.Header?.Share == share ? file : null;
    }

    /// <summary>Opens a part: as it stands when it is complete, to go on when it is not, new when there is none.</summary>
    /// <param name="folder">The folder of the parts; it must exist.</param>
    /// <param name="header">What the part says of itself.</param>
    /// <returns>The part, or why a file that stands in its place must not be touched.</returns>
    /// <exception cref="IOException">It cannot be written, or another process is at work on it.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be written.</exception>
    public static Checked<PartJournal> Open(string folder, RefitHeader header)
    {
        var done = Path.Combine(folder, RefitFile.NameOf(header.Share, RefitFile.Done));
        var path = Path.Combine(folder, RefitFile.NameOf(header.Share, RefitFile.Unfinished));
        string? replaces = null;
        if (System.IO.File.Exists(done))
        {
            var file = Read(done, header.Share);
            if (WhyKept(file, header) is { } problem) return Checked<PartJournal>.Bad([problem]);
            if (file is { IsComplete: true, Damage: null }) return Checked<PartJournal>.Good(new PartJournal(done, null, file.Outcomes.Count));
            replaces = $"{done} is damaged ({file.Damage ?? "it has no end"}) and is made again.";
        }

        var journal = RefitJournal.Open(path, Busy(header.Share));
        try
        {
            // Between the two looks another run may have finished the part, and what is open now may be its very file under its final name.
            var isGone = !System.IO.File.Exists(path);
            if (isGone || (replaces is null && System.IO.File.Exists(done)))
            {
                if (!isGone && new FileInfo(path).Length == 0 && !OperatingSystem.IsWindows()) System.IO.File.Delete(path);
                journal.Dispose();
                return Open(folder, header);
            }

            if (WhyKept(journal.Content, header) is { } problem)
            {
                journal.Dispose();
                return Checked<PartJournal>.Bad([problem]);
            }

            journal.GoOn(header);
            return Checked<PartJournal>.Good(new PartJournal(done, journal, journal.Kept.Count) { Replaces = replaces });
        }
        catch
        {
            journal.Dispose();
            throw;
        }
    }

    /// <summary>Closes the part with its end and gives it its final name.</summary>
    public void Complete()
    {
        if (journal is null) return;
        journal.End();
        // Where an open file can be renamed it keeps its lock until it has its name, so that no other run takes it for unfinished.
        if (OperatingSystem.IsWindows()) journal.Dispose();
        System.IO.File.Move(journal.Path, File, overwrite: true);
        journal.Dispose();
    }

    /// <inheritdoc/>
    public void Dispose() => journal?.Dispose();

    /// <summary>Why a file that stands in a part's place must stay as it is: it is something else, or made from something else.</summary>
    private static Problem? WhyKept(RefitFile file, RefitHeader header)
    {
        if (file.Foreign is { } reason)
            return new Problem("parts.foreign", file.Path, reason, "move it away, or name another folder with --out");
        return header.Against(file.Header) is { } what
            ? new Problem("parts.other_origin", file.Path, what, "delete it if it is out of date, or name another folder with --out")
            : null;
    }

    private static RefitFile Read(string path, RefitShare share) => FileLocks.Exclusively(Busy(share), () => RefitFile.Read(path));

    private static string Busy(RefitShare share) => $"another run is at work on part {share.Part} of {share.Parts}; wait until it has ended.";
}
