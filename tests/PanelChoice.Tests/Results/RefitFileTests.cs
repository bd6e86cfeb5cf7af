using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Results.Refits;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Results;

/// <summary>The bytes of a part: what comes back, what is noticed, what is gone on with.</summary>
public sealed class RefitFileTests : IDisposable
{
    private static readonly RefitOrigin Origin = new("aa11", "bb22", 7, -8, "vector512", "0.1.0", ".NET on X64", "cc33", 3, 5, 4);
    private static readonly RefitHeader Header = new(new RefitShare(2, 2), "../study.toml", Origin);

    private static readonly ImmutableArray<(RefitSeries Series, int Number, RefitOutcome Outcome)> Refits =
    [
        (RefitSeries.Bootstrap, 2, new(FitStatus.Converged, [1.0 / 3, -0.0, double.Epsilon], -12.5, 4, true, null, []) { Decrement = 3e-9 }),
        (RefitSeries.Bootstrap, 3, new(FitStatus.Separated, [double.MaxValue, double.NegativeInfinity, double.NaN], double.NaN, 0, false, "séparé", [2, 0])),
        (RefitSeries.Bootstrap, 4, new(FitStatus.Stopped, [], double.NaN, 100, true, "", [])),
        (RefitSeries.Jackknife, 2, new(FitStatus.Boundary, [1, 2, BitConverter.UInt64BitsToDouble(0x7FF8_0000_DEAD_BEEF)], 0, 1, false, null, [])),
        (RefitSeries.Jackknife, 3, new(FitStatus.NotIdentified, [1, 2, 3], double.PositiveInfinity, 1, false, null, [1]) { Decrement = double.NaN }),
    ];

    private readonly TemporaryFolder folder = new();

    private string Folder => Path.GetDirectoryName(folder.PathOf("x"))!;

    public void Dispose() => folder.Dispose();

    [Fact]
    public void Every_bit_of_every_refit_comes_back()
    {
        var file = RefitFile.Read(Write());
        Assert.True(file is { IsComplete: true, Damage: null, Foreign: null });
        Assert.Equal(Header, file.Header);
        Assert.Equal(Refits.Length, file.Outcomes.Count);
        foreach (var (series, number, sent) in Refits)
        {
            var got = file.Outcomes[(series, number)];
            Assert.Equal((sent.Status, sent.Iterations, sent.Retried, sent.FailureKind), (got.Status, got.Iterations, got.Retried, got.FailureKind));
            Assert.Equal(sent.FailedParameters.ToArray(), got.FailedParameters.ToArray());
            Assert.Equal(
                sent.Parameters.Append(sent.LogLikelihood).Append(sent.Decrement).Select(BitConverter.DoubleToUInt64Bits),
                got.Parameters.Append(got.LogLikelihood).Append(got.Decrement).Select(BitConverter.DoubleToUInt64Bits));
        }
    }

    [Fact]
    public void Nothing_that_an_outcome_holds_is_left_out() =>
        Assert.Equal(
            ["Decrement", "FailedParameters", "FailureKind", "Iterations", "LogLikelihood", "Parameters", "Retried", "Status"],
            typeof(RefitOutcome).GetProperties().Select(p => p.Name).Order(StringComparer.Ordinal));

    [Fact]
    public void A_file_that_breaks_off_anywhere_is_never_taken_for_complete_and_goes_on_to_the_same_bytes()
    {
        var whole = File.ReadAllBytes(Write());
        var unfinished = folder.PathOf("part-2-of-2.unfinished");
        var found = new SortedSet<int>();
        for (var length = 0; length < whole.Length; length++)
        {
            var cut = RefitFile.Read("cut", new MemoryStream(whole[..length]));
            Assert.False(cut.IsComplete);
            Assert.Null(cut.Foreign);
            // Going on costs several flushes to the disk; it is tried behind every record and at some places inside.
            if (length != cut.ValidLength && length % 37 != 0) continue;
            File.Delete(folder.PathOf("part-2-of-2.refits"));
            File.WriteAllBytes(unfinished, whole[..length]);
            found.Add(Write(cut.Outcomes.Count));
            Assert.Equal(whole, File.ReadAllBytes(folder.PathOf("part-2-of-2.refits")));
            Assert.False(File.Exists(unfinished));
        }

        Assert.Equal(Enumerable.Range(0, Refits.Length + 1), found);
    }

    [Fact]
    public void A_byte_that_changed_is_noticed_wherever_it_is()
    {
        var whole = File.ReadAllBytes(Write());
        for (var i = 0; i < whole.Length; i++)
        {
            var changed = (byte[])whole.Clone();
            changed[i] ^= 0x10;
            var file = RefitFile.Read("changed", new MemoryStream(changed));
            Assert.True(file.Damage is not null || file.Foreign is not null, $"byte {i}");
        }
    }

    [Fact]
    public void Records_left_out_told_twice_or_put_after_the_end_are_noticed()
    {
        RefitFile Of(params byte[][] contents)
        {
            using var stream = new MemoryStream();
            stream.Write(RefitRecords.Layout);
            var seal = RefitRecords.FirstSeal();
            foreach (var content in contents) seal = RefitRecords.Write(stream, seal, content);
            stream.Position = 0;
            return RefitFile.Read("made", stream);
        }

        var header = RefitRecords.Of(Header);
        byte[][] refits = [.. Refits.Select(r => RefitRecords.Of(r.Series, r.Number, r.Outcome))];
        Assert.True(Of([header, .. refits, RefitRecords.End()]).IsComplete);
        Assert.NotNull(Of([header, .. refits[1..], RefitRecords.End()]).Damage);
        Assert.NotNull(Of([header, refits[0], .. refits]).Damage);
        Assert.NotNull(Of([header, .. refits, RefitRecords.End(), RefitRecords.End()]).Damage);
        Assert.NotNull(Of([.. refits]).Damage);
        Assert.NotNull(Of([header, header]).Damage);
        // A replicate of the other part, a parameter too many, a content that goes on, a kind and a status that do not exist.
        Assert.NotNull(Of([header, RefitRecords.Of(RefitSeries.Bootstrap, 1, Refits[0].Outcome)]).Damage);
        Assert.NotNull(Of([header, RefitRecords.Of(RefitSeries.Bootstrap, 2, Refits[0].Outcome with { Parameters = [1, 2, 3, 4] })]).Damage);
        Assert.NotNull(Of([header, RefitRecords.Of(RefitSeries.Bootstrap, 2, Refits[0].Outcome with { Parameters = [] })]).Damage);
        Assert.NotNull(Of([header, [.. refits[0], 0]]).Damage);
        Assert.NotNull(Of([header, [9, .. refits[0][1..]]]).Damage);
        Assert.NotNull(Of([header, RefitRecords.Of(RefitSeries.Bootstrap, 2, Refits[0].Outcome with { Status = (FitStatus)77 })]).Damage);
        Assert.NotNull(Of([[(byte)RefitRecordKind.Header, .. "{}"u8]]).Damage);
        Assert.NotNull(Of([[(byte)RefitRecordKind.Header, .. "no JSON"u8]]).Damage);
    }

    [Fact]
    public async Task A_run_that_comes_while_another_finishes_finds_the_part_at_work_or_complete()
    {
        if (OperatingSystem.IsWindows()) return;
        var done = folder.PathOf("part-2-of-2.refits");
        for (var round = 0; round < 150; round++)
        {
            File.Delete(done);
            using var begun = new ManualResetEventSlim();
            var first = Task.Run(() =>
            {
                using var journal = PartJournal.Open(Folder, Header).Value!;
                foreach (var (series, number, outcome) in Refits) journal.Refits!.Keep(series, [number], [outcome]);
                begun.Set();
                journal.Complete();
            });
            begun.Wait();
            while (true)
            {
                try
                {
                    using var second = PartJournal.Open(Folder, Header).Value!;
                    Assert.True(second.Refits is null, $"round {round}: the second run takes the part for unfinished");
                    break;
                }
                catch (IOException busy)
                {
                    Assert.StartsWith("another run is at work on part 2 of 2", busy.Message, StringComparison.Ordinal);
                }
            }

            await first;
            Assert.True(RefitFile.Read(done).IsComplete);
            Assert.Equal(["part-2-of-2.refits"], Directory.GetFiles(Folder).Select(f => Path.GetFileName(f)!));
        }
    }

    [Fact]
    public void A_layout_of_a_later_version_is_called_so()
    {
        var later = RefitFile.Read("later", new MemoryStream([.. "panelchoice-refits/2\n"u8, 1, 2, 3]));
        Assert.Contains("layout panelchoice-refits/2", later.Foreign, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("1/1", 1, 1)]
    [InlineData("3/16", 3, 16)]
    [InlineData("9999/9999", 9999, 9999)]
    public void A_share_is_read_as_people_write_it(string text, int part, int parts) => Assert.Equal(new RefitShare(part, parts), RefitShare.Parse(text));

    [Theory]
    [InlineData("")]
    [InlineData("/")]
    [InlineData("3")]
    [InlineData("0/3")]
    [InlineData("4/3")]
    [InlineData("-1/3")]
    [InlineData("1/3/5")]
    [InlineData("1 / 3")]
    [InlineData("1/10000")]
    [InlineData("1/99999999999")]
    [InlineData("one/three")]
    public void What_is_no_share_is_not_read_as_one(string text) => Assert.Null(RefitShare.Parse(text));

    [Fact]
    public void Part_names_sort_in_the_order_of_the_parts() =>
        Assert.Equal(["part-003-of-120.refits", "part-120-of-120.refits"], [RefitFile.NameOf(new(3, 120), ".refits"), RefitFile.NameOf(new(120, 120), ".refits")]);

    private string Write()
    {
        Write(0);
        return folder.PathOf("part-2-of-2.refits");
    }

    /// <summary>Makes the part, from what is there; gives how many refits that was.</summary>
    private int Write(int found)
    {
        using var journal = PartJournal.Open(Folder, Header).Value!;
        Assert.Equal(found, journal.Found);
        foreach (var (series, number, outcome) in Refits)
            if (journal.Refits!.Find(series, number) is null) journal.Refits!.Keep(series, [number], [outcome]);
        journal.Complete();
        return journal.Found;
    }
}
