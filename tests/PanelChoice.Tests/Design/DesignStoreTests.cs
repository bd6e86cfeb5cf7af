using PanelChoice.Design.Store;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;
using static PanelChoice.Tests.Design.PartedDesignTests;

namespace PanelChoice.Tests.Design;

/// <summary>A design that is kept in a file: the same bits as in memory, and refused with one sentence where it is not what it should be.</summary>
public sealed class DesignStoreTests : IDisposable
{
    private readonly TemporaryFolder folder = new();
    private readonly StudySpecification study;
    private readonly string store;

    public DesignStoreTests()
    {
        study = Write(folder, "recorded", "drop", "");
        store = folder.PathOf("kept.store");
        using var made = Good(Keep(study));
    }

    public void Dispose() => folder.Dispose();

    [Theory]
    [InlineData(0)]
    [InlineData(6_000)]
    [InlineData(1 << 30)]
    public void A_store_gives_the_bits_of_memory_however_much_memory_it_may_take(long memoryBytes)
    {
        using var memory = Good(PanelAnalysisSample.Read(study, WorkContext.Quiet));
        using var kept = Good(PanelAnalysisSample.Keep(study, store, memoryBytes, 0, 100, WorkContext.Quiet));
        Same(memory.Sample, kept.Sample);
        Same(memory.Design, kept.Design);
        Same(memory.Static()!.Design, kept.Static()!.Design);
        Assert.Equal(memory.Static()!.Means.AsEnumerable(), kept.Static()!.Means);
    }

    [Fact]
    public void Blocks_are_read_in_any_order_by_many_at_once()
    {
        using var kept = Good(Keep(study));
        using var memory = Good(PanelAnalysisSample.Read(study, WorkContext.Quiet));
        var blocks = kept.Design.Blocks;
        Assert.InRange(blocks.Length, 2, 100);
        Parallel.For(0, 8, i =>
        {
            var (one, other) = (kept.Design.Store.Reader(), memory.Design.Store.Reader());
            var random = new CounterRandom(i, "order", 0);
            for (var n = 0; n < 200; n++)
            {
                var b = random.Next(blocks.Length);
                one.Open(blocks[b]);
                other.Open(memory.Design.Blocks[b]);
                Assert.Equal(other.OfferedMasks.ToArray(), one.OfferedMasks.ToArray());
                Assert.Equal(other.Value(0, n % blocks[b].Situations), one.Value(0, n % blocks[b].Situations));
            }
        });
    }

    [Fact]
    public void A_store_is_used_without_reading_the_data_while_size_and_time_of_the_file_stay()
    {
        var written = File.GetLastWriteTimeUtc(study.Panel.FullPath);
        var text = File.ReadAllText(study.Panel.FullPath);
        // The same size and time with other content: nobody reads it.
        File.WriteAllText(study.Panel.FullPath, new string('x', text.Length));
        File.SetLastWriteTimeUtc(study.Panel.FullPath, written);
        using (Good(Keep(study))) { }

        // Another time: the bytes decide.
        File.SetLastWriteTimeUtc(study.Panel.FullPath, written.AddMinutes(1));
        Refused("store.other_data", study);
        File.WriteAllText(study.Panel.FullPath, text);
        using (Good(Keep(study))) { }
        File.AppendAllText(study.Panel.FullPath, "\n");
        Refused("store.other_data", study);
        File.Delete(study.Panel.FullPath);
        Refused("data.not_found", study);
    }

    [Fact]
    public void A_study_with_other_terms_is_refused_and_one_with_other_replicates_is_not()
    {
        using (Good(Keep(study with { Title = "Another", Inference = study.Inference with { Replicates = 5 }, Estimate = study.Estimate with { Seed = 1 } }))) { }
        Refused("store.other_study", study with { Terms = study.Terms.RemoveAt(1) });
        Refused("store.other_study", study with { Terms = study.Terms.SetItem(1, study.Terms[1] with { Scale = 2 }) });
        Refused("store.other_study", study with { Terms = study.Terms.SetItem(6, study.Terms[6] with { Source = new StockSource(0.6) }) });
        Refused("store.other_study", study with { History = study.History with { LongestGap = 4 } });
        Refused("store.other_study", study with { Inference = study.Inference with { Cluster = "person" } });
        Refused("store.other_study", study with { Estimate = study.Estimate with { Form = NestedLogitForm.Unscaled } });
    }

    [Fact]
    public void Every_damaged_byte_is_noticed()
    {
        var bytes = File.ReadAllBytes(store);
        // Somewhere in the preamble, in each block's part of the file, and in the header at its end.
        for (var at = 12; at < bytes.Length; at += at < 36 ? 5 : 977)
        {
            if (at is >= 36 and < 64) continue;
            var damaged = (byte[])bytes.Clone();
            damaged[at] ^= 0x10;
            File.WriteAllBytes(store, damaged);
            Refused("store.damaged", study);
        }
    }

    [Fact]
    public void A_store_that_was_cut_off_or_goes_on_is_damaged()
    {
        var bytes = File.ReadAllBytes(store);
        foreach (var length in new[] { 12, 63, 64, 5_000, bytes.Length - 1 })
        {
            File.WriteAllBytes(store, bytes[..length]);
            Refused("store.damaged", study);
        }

        File.WriteAllBytes(store, [.. bytes, 0]);
        Refused("store.damaged", study);
    }

    [Fact]
    public void Another_file_is_refused_and_left_as_it_is()
    {
        foreach (var text in new[] { "", "PANEL", "who,when\n1,2\n" })
        {
            File.WriteAllText(store, text);
            Refused("store.not_a_store", study);
            Assert.Equal(text, File.ReadAllText(store));
        }
    }

    [Fact]
    public void Another_version_of_the_layout_is_refused_by_its_number()
    {
        var bytes = File.ReadAllBytes(store);
        bytes[8] = 9;
        File.WriteAllBytes(store, bytes);
        Assert.Contains("version 9", Refused("store.other_version", study), StringComparison.Ordinal);
    }

    [Fact]
    public void Nothing_is_left_behind_where_the_data_are_rejected()
    {
        File.Delete(store);
        File.AppendAllText(study.Panel.FullPath, "1,1,A,1,0,x,fine,1,0,1\n");
        Assert.NotEmpty(Keep(study).Problems);
        Assert.Equal(["panel.csv", "study.toml"], Directory.GetFiles(Path.GetDirectoryName(store)!).Select(f => Path.GetFileName(f)!).Order(StringComparer.Ordinal));
    }

    [Fact]
    public void The_checksum_is_the_published_one() =>
        // RFC 3720, appendix B.4: 32 bytes of zeros, 32 of ones, and 0 to 31; the usual check value of nine digits.
        Assert.Equal(
            [0x8A9136AAu, 0x62A8AB43u, 0x46DD794Eu, 0xE3069283u],
            [
                Checksum.Of(new byte[32]), Checksum.Of(Enumerable.Repeat((byte)0xFF, 32).ToArray()),
                Checksum.Of(Enumerable.Range(0, 32).Select(i => (byte)i).ToArray()), Checksum.Of("123456789"u8),
            ]);

    private Checked<PanelAnalysisSample> Keep(StudySpecification of) => PanelAnalysisSample.Keep(of, store, 0, 0, 100, WorkContext.Quiet);

    private string Refused(string id, StudySpecification of)
    {
        var problem = Assert.Single(DesignStore.Open(store, of, _ => 0).Problems);
        Assert.Equal(id, problem.Id);
        return problem.Sentence;
    }
}
