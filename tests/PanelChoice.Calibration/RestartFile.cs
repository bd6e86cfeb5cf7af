namespace PanelChoice.Calibration;

/// <summary>
/// Keeps outcomes by scenario, persons and panel as lines that are appended as they come, in whatever order. The first line says what they depend on
/// besides; a file of another study is refused. A line that a stopped run left unfinished is passed over.
/// </summary>
internal sealed class RestartFile : IDisposable
{
    private const string End = "|";
    private readonly Dictionary<(char, int, int), string> kept = [];
    private readonly StreamWriter? writer;

    /// <summary>Opens or makes the file.</summary>
    /// <param name="path">Its path; null keeps nothing.</param>
    /// <param name="head">What outcomes depend on besides scenario, persons and panel.</param>
    /// <exception cref="InvalidDataException">The file belongs to another study.</exception>
    public RestartFile(string? path, string head)
    {
        if (path is null) return;
        var isNew = !File.Exists(path);
        if (!isNew)
        {
            var lines = File.ReadAllLines(path);
            if (lines.Length == 0 || lines[0] != head) throw new InvalidDataException($"{path} belongs to another study: '{lines.FirstOrDefault()}', not '{head}'");
            foreach (var line in lines.Skip(1).Where(l => l.EndsWith(End, StringComparison.Ordinal)))
            {
                var parts = line[..^End.Length].Split(' ', 4);
                kept[(parts[0][0], int.Parse(parts[1]), int.Parse(parts[2]))] = parts[3];
            }
        }

        writer = new StreamWriter(path, append: true) { AutoFlush = true };
        // A line that was cut off gets an end of its own, so that it spoils no other.
        writer.WriteLine(isNew ? head : "");
    }

    /// <summary>The outcome kept; null when there is none.</summary>
    public string? Find(char scenario, int persons, int panel) => kept.GetValueOrDefault((scenario, persons, panel));

    /// <summary>Keeps an outcome.</summary>
    public void Keep(char scenario, int persons, int panel, string written)
    {
        if (writer is null) return;
        lock (writer) writer.WriteLine($"{scenario} {persons} {panel} {written}{End}");
    }

    public void Dispose() => writer?.Dispose();
}
