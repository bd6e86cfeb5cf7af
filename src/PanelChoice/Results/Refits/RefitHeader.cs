using System.Text.Json;
using PanelChoice.Inference;

namespace PanelChoice.Results.Refits;

/// <summary>What a file of refits says of itself before them.</summary>
/// <param name="Share">Which part it is; the whole in the journal of a run.</param>
/// <param name="StudyFile">The study file as seen from the folder of the file, with forward slashes.</param>
/// <param name="Origin">What its refits depend on.</param>
internal sealed record RefitHeader(RefitShare Share, string StudyFile, RefitOrigin Origin)
{
    /// <summary>The header of a file in a folder.</summary>
    /// <param name="share">Which part.</param>
    /// <param name="folder">The folder.</param>
    /// <param name="study">The study file.</param>
    /// <param name="origin">What its refits depend on.</param>
    public static RefitHeader Of(RefitShare share, string folder, string study, RefitOrigin origin) =>
        // Seen from the folder both may be moved together or mounted elsewhere.
        new(share, Path.GetRelativePath(Path.GetFullPath(folder), Path.GetFullPath(study)).Replace(Path.DirectorySeparatorChar, '/'), origin);

    /// <summary>In what a file's header differs from this one in as far as its refits are others, as the middle of a sentence; null when in nothing, or when there is no header.</summary>
    public string? Against(RefitHeader? there) =>
        there is null ? null
        : Origin.Against(there.Origin) is { } difference ? $"it was made from something else and differs in {difference.Words}"
        : there.Share != Share ? $"it holds part {there.Share.Part} of {there.Share.Parts}"
        : null;

    /// <summary>Replicates in the part.</summary>
    public int Replicates => Share.Count(Origin.Replicates);

    /// <summary>Refits without a cluster in the part.</summary>
    public int Deletions => Share.Count(Origin.Deletions);

    /// <summary>Whether a refit belongs to the part.</summary>
    public bool Holds(RefitSeries series, int number)
    {
        var count = series == RefitSeries.Bootstrap ? Origin.Replicates : Origin.Deletions;
        return number >= Share.First(count) && number < Share.First(count) + Share.Count(count);
    }

    /// <summary>The header as JSON, in UTF-8; its names stay as they are.</summary>
    public byte[] ToJson()
    {
        using var bytes = new MemoryStream();
        using (var json = new Utf8JsonWriter(bytes))
        {
            json.WriteStartObject();
            json.WriteNumber("part", Share.Part);
            json.WriteNumber("parts", Share.Parts);
            json.WriteString("key", Origin.Key);
            json.WriteString("study_file", StudyFile);
            json.WriteString("study_sha256", Origin.Study);
            json.WriteString("data_sha256", Origin.Data);
            json.WriteNumber("estimate_seed", Origin.EstimateSeed);
            json.WriteNumber("bootstrap_seed", Origin.BootstrapSeed);
            json.WriteString("kernel", Origin.Kernel);
            json.WriteString("version", Origin.Version);
            json.WriteString("runtime", Origin.Runtime);
            json.WriteString("estimate_sha256", Origin.Estimate);
            json.WriteNumber("parameters", Origin.Parameters);
            json.WriteNumber("replicates", Origin.Replicates);
            json.WriteNumber("deletions", Origin.Deletions);
            json.WriteEndObject();
        }

        return bytes.ToArray();
    }

    /// <summary>The header from its JSON; null where it makes no sense.</summary>
    public static RefitHeader? FromJson(ReadOnlyMemory<byte> bytes)
    {
        try
        {
            using var document = JsonDocument.Parse(bytes);
            var root = document.RootElement;
            string Text(string name) => root.GetProperty(name).GetString() ?? throw new FormatException(name);
            int Count(string name, int least, int most) =>
                root.GetProperty(name).GetInt32() is var n && n >= least && n <= most ? n : throw new FormatException(name);
            var parts = Count("parts", 1, RefitShare.MostParts);
            var header = new RefitHeader(
                new RefitShare(Count("part", 1, parts), parts), Text("study_file"),
                new RefitOrigin(
                    Text("study_sha256"), Text("data_sha256"), root.GetProperty("estimate_seed").GetInt64(), root.GetProperty("bootstrap_seed").GetInt64(),
                    Text("kernel"), Text("version"), Text("runtime"), Text("estimate_sha256"), Count("parameters", 0, int.MaxValue),
                    Count("replicates", 0, int.MaxValue), Count("deletions", 0, int.MaxValue)));
            return Text("key") == header.Origin.Key ? header : null;
        }
        catch (Exception senseless) when (senseless is JsonException or KeyNotFoundException or InvalidOperationException or FormatException)
        {
            return null;
        }
    }
}
