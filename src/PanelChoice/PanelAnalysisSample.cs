using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Design.Store;
using PanelChoice.Diagnostics;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice;

/// <summary>What an estimation starts from: the sample and its design. The table and the panel that it was made from need not be in memory.</summary>
public sealed class PanelAnalysisSample : IDisposable
{
    /// <summary>The design is held up to this share of the memory, because the sums over persons and clusters grow with the panel too.</summary>
    private const long ShareHeld = 2;

    /// <summary>Memory for sorting: nothing else is in it while rows are sorted, but the process itself must stay within what it will take later.</summary>
    private const long ShareOfSort = 4, LeastForSort = 8 << 20, MostForSort = 256 << 20;

    private readonly Lazy<StaticDesign?> staticDesign;

    private readonly DesignStore? store;
    private Problem? littleMemory;

    private PanelAnalysisSample(EstimationSample sample, ChoiceDesign design, Func<StaticDesign?> staticDesign, DesignStore? store)
    {
        this.store = store;
        Sample = sample;
        Design = design;
        this.staticDesign = new Lazy<StaticDesign?>(staticDesign);
    }

    /// <summary>Counts and words about the recorded panel and the sample.</summary>
    public EstimationSample Sample { get; }

    /// <summary>The design.</summary>
    public ChoiceDesign Design { get; }

    /// <summary>Whether results may name clusters by their ids; pseudonyms otherwise.</summary>
    public bool ShowsIds { get; set; }

    /// <summary>Most refits that may be at work at a time.</summary>
    internal int RefitsAtOnce { get; private init; } = int.MaxValue;

    /// <summary>The design on which the cause of dependence is judged; made when it is first asked for.</summary>
    internal StaticDesign? Static() => staticDesign.Value;

    /// <summary>Reads and checks the data and builds the design in memory, part by part where the file is in order of persons.</summary>
    /// <param name="study">The study.</param>
    /// <param name="work">Progress and cancellation.</param>
    /// <returns>The sample, or every problem found.</returns>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static Checked<PanelAnalysisSample> Read(StudySpecification study, WorkContext work) =>
        Read(study, TableScan.BytesKept, TableScan.RowsOfPart, work);

    /// <summary>The same with the sizes of what is kept and of a part given.</summary>
    internal static Checked<PanelAnalysisSample> Read(StudySpecification study, long bytesKept, int rowsOfPart, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(work);
        return Parts(study, bytesKept, rowsOfPart, null, work, (_, designs) =>
            designs.Main(format => new MemoryBlockStore(format)).Then(made => WithTests(study, new PanelAnalysisSample(
                made.Sample, made.Design,
                () => StaticDesign.Of(study, made.Sample, made.Design, terms => designs.Other(terms, f => new MemoryBlockStore(f)).Value, f => new MemoryBlockStore(f)), null))));
    }

    /// <summary>
    /// Takes the built sample from a store, or makes the store first where there is none. The data are read only to make it, and nothing of the design is
    /// held in memory but what is asked for: the rest is read from the store whenever it is needed.
    /// </summary>
    /// <param name="study">The study.</param>
    /// <param name="store">The store's file.</param>
    /// <param name="memoryBytes">Bytes of memory that the panel may take.</param>
    /// <param name="work">Progress and cancellation.</param>
    /// <returns>The sample, every problem found with the data, or why the store is not to be used.</returns>
    /// <exception cref="IOException">The store cannot be written, or there is no room beside it to sort the panel's rows.</exception>
    /// <exception cref="UnauthorizedAccessException">The store may not be written.</exception>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static Checked<PanelAnalysisSample> Keep(StudySpecification study, string store, long memoryBytes, WorkContext work) =>
        Keep(study, store, memoryBytes, TableScan.BytesKept, TableScan.RowsOfPart, work);

    /// <summary>The same with the sizes of what is kept and of a part given.</summary>
    internal static Checked<PanelAnalysisSample> Keep(
        StudySpecification study, string store, long memoryBytes, long bytesKept, int rowsOfPart, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentException.ThrowIfNullOrEmpty(store);
        ArgumentNullException.ThrowIfNull(work);
        if (study.Inference is { Blocks: not BootstrapBlocks.Cluster, Replicates: > 0 })
            return Checked<PanelAnalysisSample>.Bad(
            [
                new Problem(
                    "store.blocks", study.File, "blocks of occasions or days need sums for each of them in memory, which the budget of a store does not count",
                    "run without a store, or draw whole clusters: blocks = \"cluster\""),
            ]);
        if (!File.Exists(store))
        {
            var problems = Make(study, store, memoryBytes, bytesKept, rowsOfPart, work);
            if (!problems.IsEmpty) return Checked<PanelAnalysisSample>.Bad(problems);
        }

        var memory = (RunMemory?)null;
        return DesignStore.Open(store, study, design =>
        {
            memory = RunMemory.Of(design, study.Inference);
            return Math.Min(memoryBytes / ShareHeld, memory.Left(memoryBytes, work.Threads));
        }).Then(kept => WithTests(study, new PanelAnalysisSample(
            kept.Sample, kept.Main, () => kept.Second is null ? null : new StaticDesign(kept.Second, kept.SecondNames), kept)
            {
                RefitsAtOnce = memory!.RefitsAtOnce(memoryBytes),
                littleMemory = memoryBytes < memory.Least ? LittleMemory(kept, memoryBytes, memory) : null,
            }));
    }

    private static Problem LittleMemory(DesignStore kept, long memoryBytes, RunMemory needed) => new(
        "store.little_memory", kept.File,
        string.Create(
            CultureInfo.InvariantCulture,
            $"the sums over {kept.Main.Persons:#,0} persons do not fit into a budget of {memoryBytes / 1_000_000:#,0} MB, however little of the design is held"),
        string.Create(CultureInfo.InvariantCulture, $"give --memory {Math.Ceiling(needed.Least / 1e6)} or more"));

    /// <summary>Runs an estimation on the sample; a budget that cannot hold what it takes, and a store that cannot be read any more, become problems.</summary>
    internal Checked<T> Estimate<T>(Func<Checked<T>> use)
        where T : class => littleMemory is { } problem ? Checked<T>.Bad([problem]) : StoreReadException.Guard(store?.File, use);

    /// <summary>A sample, or what is wrong with the study's tests that only the data could tell.</summary>
    private static Checked<PanelAnalysisSample> WithTests(StudySpecification study, PanelAnalysisSample sample)
    {
        var problems = TermTestPlan.Problems(study, sample.Sample.Covariates, sample.Design.Layout);
        if (problems.IsEmpty) return Checked<PanelAnalysisSample>.Good(sample);
        sample.Dispose();
        return Checked<PanelAnalysisSample>.Bad(problems);
    }

    /// <summary>Lets go of the store's file, where there is one.</summary>
    public void Dispose() => store?.Dispose();

    private static Checked<T> Parts<T>(
        StudySpecification study, long bytesKept, int rowsOfPart, RowSort? sort, WorkContext work, Func<PanelParts, PartedDesigns, Checked<T>> use)
        where T : class
    {
        work.Report("reading the data", 0, 1);
        var made = TableScan.Of(study, bytesKept, sort)
            .Then(scan => PanelParts.Of(study, scan, rowsOfPart))
            .Then(parts => NestTreeBuilder.Build(study, parts.Outline.Alternatives).Then(tree => use(parts, new PartedDesigns(study, parts, tree, work))));
        work.Report("reading the data", 1, 1);
        return made;
    }

    private static ImmutableArray<Problem> Make(
        StudySpecification study, string store, long memoryBytes, long bytesKept, int rowsOfPart, WorkContext work)
    {
        using var sort = new RowSort(store, Math.Clamp(memoryBytes / ShareOfSort, LeastForSort, MostForSort), work);
        try
        {
            return StoreReadException.Guard(
                store, () => Parts(study, bytesKept, rowsOfPart, sort, work, (parts, designs) => Make(study, store, parts, designs))).Problems;
        }
        catch (DiskWriteException e)
        {
            throw new IOException(e.Message, e);
        }
    }

    /// <summary>Makes a store: the design of the study's terms and that on which the cause of dependence is judged, so that the data are not needed again.</summary>
    private static Checked<DesignedSample> Make(StudySpecification study, string store, PanelParts parts, PartedDesigns designs)
    {
        using var writer = new StoreWriter(store);
        var sections = new List<StoreWriter.Section>();
        return designs.Main(Begin).Then(made =>
        {
            var still = StaticDesign.Of(study, made.Sample, made.Design, terms => designs.Other(terms, Begin).Value);
            var (sample, design) = (made.Sample, made.Design);
            writer.Complete(new StoreHeader(
                new StoreOrigin(DesignFingerprint.Of(study), parts.Outline.File, parts.Outline.Sha256, parts.Stamp), sample, design.PersonStart,
                design.PersonWeight, design.ClusterBy, design.ClusterOf, design.Clusters, [.. design.Blocks.Select(b => b.Situations)],
                Stored(design), still is null ? null : Stored(still.Design), still?.Means ?? []));
            return Checked<DesignedSample>.Good(made);
        });

        StoreWriter.Section Begin(BlockFormat format)
        {
            sections.Add(writer.Begin(format));
            return sections[^1];
        }

        StoredDesign Stored(ChoiceDesign design) => sections.Single(s => s.Store == design.Store).Of(design);
    }
}
