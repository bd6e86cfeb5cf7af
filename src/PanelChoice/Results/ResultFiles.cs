using PanelChoice.Results.Refits;

namespace PanelChoice.Results;

/// <summary>The files that a run leaves in its output folder.</summary>
public static class ResultFiles
{
    /// <summary>Names of the files, in the order they are written; only these are ever replaced.</summary>
    public static IReadOnlyList<string> Names { get; } = ["result.json", "coefficients.csv", "replicates.parquet"];

    /// <summary>The file that keeps a run's refits in the folder until the others are there.</summary>
    public static string Journal => RunJournal.Name;

    /// <summary>Finds out before a long run whether the folder can be written, without leaving anything behind.</summary>
    /// <param name="folder">The folder; it need not exist yet.</param>
    /// <exception cref="IOException">It cannot be made or written, a file stands in its place, or another run is at work on it.</exception>
    /// <exception cref="UnauthorizedAccessException">The user may not write there.</exception>
    public static void Probe(string folder)
    {
        ArgumentException.ThrowIfNullOrEmpty(folder);
        var existing = Path.GetFullPath(folder);
        while (!Directory.Exists(existing))
        {
            if (File.Exists(existing)) throw new IOException($"'{existing}' is a file, not a folder.");
            existing = Path.GetDirectoryName(existing) ?? throw new IOException($"'{folder}' cannot be made.");
        }

        var probe = Path.Combine(existing, $".{Guid.NewGuid():N}.part");
        try
        {
            File.WriteAllBytes(probe, []);
            File.Delete(probe);
        }
        catch (Exception refused) when (refused is IOException or UnauthorizedAccessException)
        {
            throw new IOException($"no file can be made in '{existing}'.", refused);
        }

        RunJournal.RefuseBusy(folder);
    }

    /// <summary>Takes away what a run that was killed while it wrote has left under temporary names.</summary>
    /// <param name="folder">The folder; nobody else may be writing these files in it.</param>
    internal static void RemoveLeftovers(string folder)
    {
        foreach (var name in Names) AtomicFile.RemoveLeftovers(Path.Combine(folder, name));
    }

    /// <summary>Writes all files, or none: nothing is replaced before every one is complete.</summary>
    /// <param name="result">The result.</param>
    /// <param name="folder">The folder; it is made when it does not exist.</param>
    /// <exception cref="IOException">It cannot be written.</exception>
    /// <exception cref="UnauthorizedAccessException">The user may not write there.</exception>
    public static void Write(AnalysisResult result, string folder)
    {
        ArgumentNullException.ThrowIfNull(result);
        ArgumentException.ThrowIfNullOrEmpty(folder);
        Directory.CreateDirectory(folder);
        AtomicFile.WriteAll(
        [
            new PlannedFile(Path.Combine(folder, Names[0]), s => ResultJson.Write(result, s)),
            new PlannedFile(Path.Combine(folder, Names[1]), s => CoefficientsCsv.Write(result, s)),
            new PlannedFile(Path.Combine(folder, Names[2]), s => ReplicatesParquet.Write(result, s)),
        ]);
    }
}
