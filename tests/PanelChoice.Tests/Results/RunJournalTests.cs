using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Results.Refits;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Results;

/// <summary>The journal of a run in the folder of its results: what is gone on with, what is replaced, what is left alone.</summary>
public sealed class RunJournalTests : IDisposable
{
    private static readonly RefitOrigin Origin = new("aa11", "bb22", 7, -8, "vector512", "0.1.0", ".NET on X64", "cc33", 2, 5, 4);
    private static readonly RefitHeader Header = new(new RefitShare(1, 1), "../study.toml", Origin);
    private static readonly RefitOutcome Outcome = new(FitStatus.Converged, [1.0 / 3, -0.0], -12.5, 4, false, null, []) { Decrement = 3e-9 };

    private readonly TemporaryFolder folder = new();

    private string Folder => folder.PathOf("out");

    private string Journal => Path.Combine(Folder, RunJournal.Name);

    public void Dispose() => folder.Dispose();

    [Fact]
    public void What_was_kept_is_found_and_goes_when_the_results_are_there()
    {
        Keep(3);
        Assert.Equal((3, 5, 0, 4), RunJournal.Left(Folder) is { } left ? (left.Replicates, left.ReplicatesAsked, left.Deletions, left.DeletionsAsked) : default);
        using var journal = RunJournal.Open(Folder, Header).Value!;
        Assert.Equal((3, null), (journal.Found.Replicates, journal.Found.Replaced));
        Assert.NotNull(journal.Refits.Find(RefitSeries.Bootstrap, 2));
        Assert.Null(journal.Refits.Find(RefitSeries.Bootstrap, 3));
        Assert.Null(journal.Refits.Find(RefitSeries.Jackknife, 2));
        journal.Remove();
        Assert.Empty(Directory.GetFileSystemEntries(Folder));
        Assert.Null(RunJournal.Left(Folder));
    }

    [Theory]
    [InlineData("the study file")]
    [InlineData("the data file")]
    [InlineData("the version of the program")]
    [InlineData("the runtime")]
    [InlineData("the kernel")]
    [InlineData("the seed of the starts")]
    [InlineData("the seed of the bootstrap")]
    [InlineData("the bits of the estimate")]
    [InlineData("the number of replicates")]
    public void One_that_was_made_from_something_else_is_replaced_and_the_sentence_names_it(string what)
    {
        var other = what switch
        {
            "the study file" => Origin with { Study = "dd44" },
            "the data file" => Origin with { Data = "dd44" },
            "the version of the program" => Origin with { Version = "0.2.0" },
            "the runtime" => Origin with { Runtime = ".NET on Arm64" },
            "the kernel" => Origin with { Kernel = "vector256" },
            "the seed of the starts" => Origin with { EstimateSeed = 8 },
            "the seed of the bootstrap" => Origin with { BootstrapSeed = 8 },
            "the bits of the estimate" => Origin with { Estimate = "dd44" },
            _ => Origin with { Replicates = 6 },
        };
        Keep(3);
        using (var journal = RunJournal.Open(Folder, Header with { Origin = other }).Value!)
        {
            Assert.StartsWith(
                $"{Journal} is not used and is replaced: it was made from something else and differs in {what} (", journal.Found.Replaced, StringComparison.Ordinal);
            Assert.Equal(0, journal.Found.Replicates);
            Assert.Null(journal.Refits.Find(RefitSeries.Bootstrap, 0));
            journal.Refits.Keep(RefitSeries.Bootstrap, [0], [Outcome]);
        }

        Assert.Equal(other, RefitFile.Read(Journal).Header!.Origin);
    }

    [Fact]
    public void One_of_another_layout_is_replaced_and_what_is_no_such_file_is_left_alone()
    {
        Directory.CreateDirectory(Folder);
        File.WriteAllText(Journal, "panelchoice-refits/9\nwhatever");
        using (var journal = RunJournal.Open(Folder, Header).Value!)
            Assert.Contains("it has the layout panelchoice-refits/9", journal.Found.Replaced, StringComparison.Ordinal);
        File.WriteAllText(Journal, "a letter to somebody else");
        Assert.Equal("journal.foreign", Assert.Single(RunJournal.Open(Folder, Header).Problems).Id);
        Assert.Equal("a letter to somebody else", File.ReadAllText(Journal));
        // And the file was let go of.
        File.Delete(Journal);
        Keep(1);
    }

    [Fact]
    public void Wherever_it_breaks_off_it_is_cut_back_to_whole_records_and_goes_on_to_the_same_bytes()
    {
        Keep(5);
        var whole = File.ReadAllBytes(Journal);
        for (var length = 0; length < whole.Length; length += length < 40 ? 1 : 29)
            foreach (var tail in new[] { 0, 7 })
            {
                // What a machine that failed leaves behind its last words may be nothing, or zeros.
                File.WriteAllBytes(Journal, [.. whole[..length], .. new byte[Math.Min(tail, whole.Length - length)]]);
                var kept = RefitFile.Read(Journal);
                using (var journal = RunJournal.Open(Folder, Header).Value!)
                {
                    Assert.Equal((kept.Outcomes.Count, null), (journal.Found.Replicates, journal.Found.Replaced));
                    for (var r = kept.Outcomes.Count; r < 5; r++) journal.Refits.Keep(RefitSeries.Bootstrap, [r], [Outcome]);
                }

                Assert.Equal(whole, File.ReadAllBytes(Journal));
            }

        File.WriteAllBytes(Journal, new byte[4096]);
        using (var journal = RunJournal.Open(Folder, Header).Value!) Assert.Null(journal.Found.Replaced);
    }

    [Fact]
    public void A_second_run_is_refused_while_the_first_has_it_open_and_not_afterwards()
    {
        using (RunJournal.Open(Folder, Header).Value!)
        {
            Assert.StartsWith("another run is at work on it", Assert.ThrowsAny<IOException>(() => RunJournal.Open(Folder, Header)).Message, StringComparison.Ordinal);
            Assert.ThrowsAny<IOException>(() => RunJournal.RefuseBusy(Folder));
            Assert.ThrowsAny<IOException>(() => PanelChoice.Results.ResultFiles.Probe(Folder));
        }

        RunJournal.RefuseBusy(Folder);
        Keep(1);
        RunJournal.RefuseBusy(Folder);
    }

    [Fact]
    public void A_run_that_ends_before_its_first_refit_leaves_nothing_behind()
    {
        using (RunJournal.Open(Folder, Header).Value!) Assert.True(File.Exists(Journal));
        Assert.False(Directory.Exists(Folder));
        Directory.CreateDirectory(Folder);
        using (RunJournal.Open(Folder, Header).Value!) Assert.True(File.Exists(Journal));
        Assert.Empty(Directory.GetFileSystemEntries(Folder));
    }

    [Fact]
    public void The_disk_is_waited_for_at_most_once_a_second_and_a_twentieth_of_the_time()
    {
        var (now, flushes) = (TimeSpan.Zero, new List<double>());
        var took = TimeSpan.FromMilliseconds(1);
        var sync = new DiskSync(() =>
        {
            flushes.Add(now.TotalSeconds);
            now += took;
        }, () => now);
        void Pass(double seconds, double each)
        {
            for (var end = now + TimeSpan.FromSeconds(seconds); now < end; sync.Written()) now += TimeSpan.FromSeconds(each);
        }

        Pass(0.9, 0.01);
        Assert.Empty(flushes);
        Pass(10, 0.01);
        Assert.InRange(flushes.Count, 9, 11);
        // A disk that takes half a second is waited for every ten.
        took = TimeSpan.FromSeconds(0.5);
        flushes.Clear();
        Pass(100, 0.01);
        Assert.InRange(flushes.Count, 10, 12);
    }

    private void Keep(int replicates)
    {
        using var journal = RunJournal.Open(Folder, Header).Value!;
        for (var r = 0; r < replicates; r++) journal.Refits.Keep(RefitSeries.Bootstrap, [r], [Outcome]);
    }
}
