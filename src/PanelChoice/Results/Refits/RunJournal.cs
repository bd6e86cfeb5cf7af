using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Results.Refits;

/// <summary>
/// The journal of a run that writes its results into a folder. It lies there until they do, so that a run that was ended is taken up again, and while it is
/// open no other run can work on the folder. One made from something else is no use to the run and is replaced.
/// </summary>
internal sealed class RunJournal : IDisposable
{
    /// <summary>Its file's name.</summary>
    public const string Name = "replicates.journal";

    private const string Busy = "another run is at work on it; wait until that has ended, or name another folder.";

    private readonly RefitJournal journal;
    private readonly string? madeFolder;
    private bool isRemoved;

    private RunJournal(RefitJournal journal, RefitHeader header, string? madeFolder, string? replaced)
    {
        (this.journal, this.madeFolder) = (journal, madeFolder);
        Found = KeptRefits.Of(journal.Path, header, journal.Kept) with { Replaced = replaced };
    }

    /// <summary>Where refits are found and kept.</summary>
    public IRefitJournal Refits => journal;

    /// <summary>What was found when it was opened.</summary>
    public KeptRefits Found { get; }

    /// <summary>Finds out whether a run is at work on a folder.</summary>
    /// <param name="folder">The folder; it need not exist.</param>
    /// <exception cref="IOException">One is.</exception>
    public static void RefuseBusy(string folder)
    {
        var path = Path.Combine(folder, Name);
        if (Directory.Exists(path)) throw new IOException($"'{path}' is a folder.");
        if (!File.Exists(path)) return;
        using (FileLocks.Exclusively(Busy, () => new FileStream(path, FileMode.Open, FileAccess.Read, FileShare.Read)))
        {
        }
    }

    /// <summary>What a run that was ended has left in a folder; null where there is nothing that a run could go on from.</summary>
    /// <param name="folder">The folder.</param>
    /// <exception cref="IOException">It cannot be read, or a run is at work on it.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be read.</exception>
    public static KeptRefits? Left(string folder)
    {
        var path = Path.Combine(folder, Name);
        if (!File.Exists(path)) return null;
        var file = FileLocks.Exclusively(Busy, () => RefitFile.Read(path));
        return file is { Header: { } header, Outcomes.Count: > 0 }
            ? KeptRefits.Of(path, header, file.Outcomes.Keys)
            : null;
    }

    /// <summary>Opens the journal of a folder: to go on where it is this run's, new where there is none or another's.</summary>
    /// <param name="folder">The folder; it is made when it does not exist.</param>
    /// <param name="header">What the journal says of itself.</param>
    /// <returns>The journal, or why a file of its name must not be touched.</returns>
    /// <exception cref="IOException">It cannot be written, or another run is at work on the folder.</exception>
    /// <exception cref="UnauthorizedAccessException">It may not be written.</exception>
    public static Checked<RunJournal> Open(string folder, RefitHeader header)
    {
        var madeFolder = Directory.Exists(folder) ? null : folder;
        Directory.CreateDirectory(folder);
        var path = Path.GetFullPath(Path.Combine(folder, Name));
        RefitJournal journal;
        do
        {
            journal = RefitJournal.Open(path, Busy);
            // A run that has just ended took the file away between its being found and its being locked.
            if (File.Exists(path)) break;
            journal.Dispose();
        }
        while (true);

        try
        {
            if (journal.Content is { Foreign: { } foreign, IsOfAnotherLayout: false })
            {
                journal.Dispose();
                return Checked<RunJournal>.Bad([new Problem("journal.foreign", path, foreign, "move it away, or name another folder with --out")]);
            }

            var other = journal.Content.Foreign ?? header.Against(journal.Content.Header);
            if (other is null) journal.GoOn(header);
            else journal.Begin(header);
            return Checked<RunJournal>.Good(new RunJournal(
                journal, header, madeFolder, other is null ? null : $"{Path.Combine(folder, Name)} is not used and is replaced: {other}."));
        }
        catch
        {
            journal.Dispose();
            throw;
        }
    }

    /// <summary>The results are in place: the journal goes.</summary>
    public void Remove()
    {
        if (OperatingSystem.IsWindows()) journal.Dispose();
        File.Delete(journal.Path);
        journal.Dispose();
        isRemoved = true;
    }

    /// <summary>Closes the journal. One that holds nothing is taken away, with its folder where that was made for it.</summary>
    public void Dispose()
    {
        if (isRemoved || journal.Kept.Count > 0)
        {
            journal.Dispose();
            return;
        }

        Remove();
        if (madeFolder is not null && !Directory.EnumerateFileSystemEntries(madeFolder).Any()) Directory.Delete(madeFolder);
    }
}
