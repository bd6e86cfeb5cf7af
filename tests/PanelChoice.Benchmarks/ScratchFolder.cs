namespace PanelChoice.Benchmarks;

/// <summary>A folder for the files of a measurement, removed afterwards.</summary>
internal sealed class ScratchFolder : IDisposable
{
    private readonly DirectoryInfo folder = Directory.CreateTempSubdirectory("panelchoice-benchmark-");

    /// <summary>The full path of a file in it.</summary>
    public string File(string name) => Path.Combine(folder.FullName, name);

    public void Dispose() => folder.Delete(recursive: true);
}
