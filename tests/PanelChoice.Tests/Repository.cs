using System.Reflection;

namespace PanelChoice.Tests;

/// <summary>Where the repository's own files are, for tests that read fixtures.</summary>
internal static class Repository
{
    public static string Root { get; } = Path.GetFullPath(
        typeof(Repository).Assembly.GetCustomAttributes<AssemblyMetadataAttribute>().Single(a => a.Key == "RepositoryRoot").Value!);

    public static string Fixture(params string[] parts) => Path.Combine([Root, "fixtures", .. parts]);
}
