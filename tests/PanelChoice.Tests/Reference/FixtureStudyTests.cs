using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Reference;

public class FixtureStudyTests
{
    public static TheoryData<string> Studies =>
        [.. Directory.EnumerateFiles(Repository.Fixture(), "study.toml", SearchOption.AllDirectories)
            .Select(f => Path.GetRelativePath(Repository.Fixture(), f)).Order(StringComparer.Ordinal)];

    [Theory]
    [MemberData(nameof(Studies))]
    public void Every_study_among_the_fixtures_is_good_and_finds_its_data(string file)
    {
        var read = StudyFileReader.Read(Repository.Fixture(file));
        Assert.Empty(read.Problems.Select(p => p.Sentence));
        Assert.True(File.Exists(read.Value!.Panel.FullPath), read.Value.Panel.FullPath);
    }

    [Fact]
    public void No_case_is_forgotten() => Assert.True(Studies.Count >= 11, $"{Studies.Count} studies");
}
