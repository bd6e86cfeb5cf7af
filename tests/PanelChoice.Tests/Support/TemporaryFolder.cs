using System.IO.Compression;
using System.Text;

namespace PanelChoice.Tests.Support;

/// <summary>A folder of its own for the files of one test, gone when the test is over.</summary>
internal sealed class TemporaryFolder : IDisposable
{
    private readonly DirectoryInfo folder = Directory.CreateTempSubdirectory("panelchoice-test-");

    public string PathOf(string name) => Path.Combine(folder.FullName, name);

    public string Write(string name, string text) => Write(name, Encoding.UTF8.GetBytes(text));

    public string Write(string name, byte[] bytes)
    {
        File.WriteAllBytes(PathOf(name), bytes);
        return PathOf(name);
    }

    public static byte[] Gzip(byte[] bytes)
    {
        using var packed = new MemoryStream();
        using (var gzip = new GZipStream(packed, CompressionLevel.Optimal)) gzip.Write(bytes);
        return packed.ToArray();
    }

    public void Dispose() => folder.Delete(recursive: true);
}
