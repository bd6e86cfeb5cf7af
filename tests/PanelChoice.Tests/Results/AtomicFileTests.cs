using PanelChoice.Results;
using Xunit;

namespace PanelChoice.Tests.Results;

public sealed class AtomicFileTests : IDisposable
{
    private readonly string folder = Directory.CreateTempSubdirectory("panelchoice-").FullName;

    public void Dispose() => Directory.Delete(folder, recursive: true);

    [Fact]
    public void Replaces_the_old_file_and_leaves_nothing_else_behind()
    {
        var path = Path.Combine(folder, "result.json");
        File.WriteAllText(path, "old");
        AtomicFile.Write(path, stream => stream.Write("new"u8));
        Assert.Equal("new", File.ReadAllText(path));
        Assert.Equal([path], Directory.GetFileSystemEntries(folder));
    }

    [Fact]
    public void A_writer_may_close_the_stream_itself()
    {
        var path = Path.Combine(folder, "table.csv");
        AtomicFile.Write(path, stream =>
        {
            using var writer = new StreamWriter(stream);
            writer.Write("a,b\n");
        });
        Assert.Equal("a,b\n", File.ReadAllText(path));
    }

    [Fact]
    public void A_failure_half_way_leaves_the_old_file_untouched_and_no_temporary_file()
    {
        var path = Path.Combine(folder, "result.json");
        File.WriteAllText(path, "old");
        Assert.Throws<InvalidOperationException>(() => AtomicFile.Write(path, stream =>
        {
            stream.Write("half"u8);
            throw new InvalidOperationException("stopped");
        }));
        Assert.Equal("old", File.ReadAllText(path));
        Assert.Equal([path], Directory.GetFileSystemEntries(folder));
    }

    [Fact]
    public void A_path_that_is_a_folder_is_refused_and_nothing_is_left_behind()
    {
        var path = Path.Combine(folder, "taken");
        Directory.CreateDirectory(path);
        var error = Record.Exception(() => AtomicFile.Write(path, stream => stream.Write("x"u8)));
        Assert.True(error is IOException or UnauthorizedAccessException);
        Assert.Equal([path], Directory.GetFileSystemEntries(folder));
    }

    [Fact]
    public void When_one_of_several_fails_no_old_file_is_touched_and_nothing_is_left_behind()
    {
        var first = Path.Combine(folder, "a.csv");
        File.WriteAllText(first, "old a");
        Assert.Throws<InvalidOperationException>(() => AtomicFile.WriteAll(
        [
            new PlannedFile(first, stream => stream.Write("new a"u8)),
            new PlannedFile(Path.Combine(folder, "b.csv"), _ => throw new InvalidOperationException("stopped")),
        ]));
        Assert.Equal("old a", File.ReadAllText(first));
        Assert.Equal([first], Directory.GetFileSystemEntries(folder));
    }

    [Fact]
    public void A_folder_in_the_place_of_one_of_several_files_is_refused_before_any_is_replaced()
    {
        var taken = Path.Combine(folder, "b.csv");
        Directory.CreateDirectory(taken);
        Assert.ThrowsAny<IOException>(() => AtomicFile.WriteAll(
            [new PlannedFile(Path.Combine(folder, "a.csv"), _ => { }), new PlannedFile(taken, _ => { })]));
        Assert.Equal([taken], Directory.GetFileSystemEntries(folder));
    }

    [Fact]
    public void A_missing_folder_is_an_io_error() =>
        Assert.ThrowsAny<IOException>(() => AtomicFile.Write(Path.Combine(folder, "nowhere", "a.csv"), _ => { }));

    [Fact]
    public void Leftovers_of_a_process_that_was_killed_are_taken_away_and_nothing_else_is()
    {
        var path = Path.Combine(folder, "result.json");
        string[] stay = ["result.json", ".result.json.part", ".result.json.mine.part", ".other.json.0123456789abcdef0123456789abcdef.part"];
        foreach (var name in stay) File.WriteAllText(Path.Combine(folder, name), "x");
        File.WriteAllText(Path.Combine(folder, ".result.json.0123456789abcdef0123456789abcdef.part"), "half");
        AtomicFile.RemoveLeftovers(path);
        Assert.Equal(stay.Order(StringComparer.Ordinal), Directory.GetFiles(folder).Select(f => Path.GetFileName(f)!).Order(StringComparer.Ordinal));
    }
}
