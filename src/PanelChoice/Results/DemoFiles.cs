using System.Text;
using PanelChoice.Simulation;

namespace PanelChoice.Results;

/// <summary>Puts the demonstration's files into a folder.</summary>
public static class DemoFiles
{
    /// <summary>Writes the data and study files; only these are ever replaced.</summary>
    /// <param name="folder">The folder; it is made when it does not exist.</param>
    /// <returns>The study files, in the order to be run.</returns>
    /// <exception cref="IOException">It cannot be written.</exception>
    /// <exception cref="UnauthorizedAccessException">The user may not write there.</exception>
    public static IReadOnlyList<string> Write(string folder)
    {
        ArgumentException.ThrowIfNullOrEmpty(folder);
        var files = DemoPanel.Files();
        Directory.CreateDirectory(folder);
        AtomicFile.WriteAll([.. files.Select(f => new PlannedFile(Path.Combine(folder, f.Name), s => s.Write(Encoding.UTF8.GetBytes(f.Text))))]);
        return [.. files.Where(f => f.IsStudy).Select(f => Path.Combine(folder, f.Name))];
    }
}
