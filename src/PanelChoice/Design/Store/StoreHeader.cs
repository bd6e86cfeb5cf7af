using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Design.Store;

/// <summary>A design as a store's header tells it: everything but the persons, whom all designs of a store share, and the content of the blocks.</summary>
/// <param name="Layout">The parameters.</param>
/// <param name="Columns">Products coefficient x covariate.</param>
/// <param name="Format">How a block is laid out.</param>
/// <param name="FirstByte">Where the first block begins in the file.</param>
/// <param name="Checksums">CRC-32C of each block.</param>
internal sealed record StoredDesign(
    ParameterLayout Layout, ImmutableArray<DesignColumn> Columns, BlockFormat Format, long FirstByte, ImmutableArray<uint> Checksums);

/// <summary>All that a store holds besides blocks. It is written and read field by field in the order in which it is declared here.</summary>
/// <param name="Origin">What the store was made from.</param>
/// <param name="Sample">The sample.</param>
/// <param name="PersonStart">First situation of each person; one more entry closes the last.</param>
/// <param name="PersonWeight">Sampling weight of each person.</param>
/// <param name="ClusterBy">"person" or the cluster column.</param>
/// <param name="ClusterOf">Cluster of each person.</param>
/// <param name="Clusters">Names of the clusters.</param>
/// <param name="BlockSituations">Situations of each block.</param>
/// <param name="Main">Design of the study's terms.</param>
/// <param name="Second">Design of other terms on the same sample; null where there is none.</param>
/// <param name="SecondNames">Names that belong to the second design.</param>
internal sealed record StoreHeader(
    StoreOrigin Origin, EstimationSample Sample, ImmutableArray<int> PersonStart, ImmutableArray<double> PersonWeight, string ClusterBy,
    ImmutableArray<int> ClusterOf, ImmutableArray<string> Clusters, ImmutableArray<int> BlockSituations, StoredDesign Main, StoredDesign? Second,
    ImmutableArray<string> SecondNames)
{
    /// <summary>The blocks.</summary>
    public ImmutableArray<DesignBlock> Blocks()
    {
        var blocks = ImmutableArray.CreateBuilder<DesignBlock>(BlockSituations.Length);
        var first = 0;
        foreach (var situations in BlockSituations)
        {
            var lanes = (situations + ChoiceDesign.TileLanes - 1) / ChoiceDesign.TileLanes * ChoiceDesign.TileLanes;
            blocks.Add(new DesignBlock(blocks.Count, first, situations, lanes));
            first += situations;
        }

        return blocks.MoveToImmutable();
    }

    /// <summary>Writes it.</summary>
    public void Write(BinaryWriter to)
    {
        Origin.Write(to);
        Write(to, Sample);
        to.WriteAll(PersonStart.Skip(1).Select((end, p) => end - PersonStart[p]), to.Write);
        to.WriteAll(PersonWeight, to.Write);
        to.Write(ClusterBy);
        to.WriteAll(ClusterOf, to.Write);
        to.WriteAll(Clusters, to.Write);
        to.WriteAll(BlockSituations, to.Write);
        Write(to, Main);
        to.Write(Second is not null);
        if (Second is not null) Write(to, Second);
        to.WriteAll(SecondNames, to.Write);
    }

    /// <summary>Reads what <see cref="Write(BinaryWriter)"/> wrote.</summary>
    /// <exception cref="InvalidDataException">It is something else.</exception>
    /// <exception cref="EndOfStreamException">It ends too early.</exception>
    public static StoreHeader Read(BinaryReader from)
    {
        var origin = StoreOrigin.Read(from);
        var sample = ReadSample(from);
        var lengths = from.ReadAll(from.ReadInt32);
        var start = new int[lengths.Length + 1];
        for (var p = 0; p < lengths.Length; p++) start[p + 1] = start[p] + lengths[p];
        var weights = from.ReadAll(from.ReadDouble);
        var clusterBy = from.ReadString();
        var clusterOf = from.ReadAll(from.ReadInt32);
        var clusters = from.ReadAll(from.ReadString);
        var situations = from.ReadAll(from.ReadInt32);
        var main = ReadDesign(from, sample.Alternatives.Length);
        var second = from.ReadBoolean() ? ReadDesign(from, sample.Alternatives.Length) : null;
        return new StoreHeader(origin, sample, [.. start], weights, clusterBy, clusterOf, clusters, situations, main, second, from.ReadAll(from.ReadString));
    }

    private static void Write(BinaryWriter to, EstimationSample sample)
    {
        to.Write(sample.File);
        to.Write(sample.Sha256);
        to.Write(sample.Rows);
        to.Write(sample.RecordedPersons);
        to.Write(sample.RecordedOccasions);
        to.Write((int)sample.OccasionKind);
        to.Write(sample.IsWeighted);
        to.Write(sample.Persons);
        to.Write(sample.Occasions);
        to.WriteAll(sample.Alternatives, a =>
        {
            to.Write(a.Name);
            to.Write(a.Offered);
            to.Write(a.Chosen);
        });
        to.WriteAll(sample.Covariates, c =>
        {
            to.Write(c.Term);
            to.WriteText(c.Alternative);
            to.WriteAll(c.Enters, to.Write);
            to.Write(c.IsConstant);
            to.Write((int)c.Role);
            to.WriteNumber(c.Fixed);
            to.WriteNumber(c.Start);
            to.Write(c.TermIndex);
        });
        to.WriteAll(sample.LeftOut, l =>
        {
            to.Write(l.Reason);
            to.Write(l.Occasions);
        });
        to.WriteAll(sample.StockStarts, s =>
        {
            to.Write(s.Term);
            to.Write(s.WeightAtFirst);
            to.Write(s.WeightAtMedian);
        });
        to.WriteAll(sample.Cautions, c =>
        {
            to.Write(c.Id);
            to.Write(c.Sentence);
        });
        sample.Times.Write(to);
        to.Write(sample.SecondCluster is not null);
        sample.SecondCluster?.Write(to);
    }

    private static EstimationSample ReadSample(BinaryReader from) => new(
        from.ReadString(), from.ReadString(), from.ReadInt64(), from.ReadInt32(), from.ReadInt32(), (OccasionKind)from.ReadInt32(), from.ReadBoolean(),
        from.ReadInt32(), from.ReadInt32(),
        from.ReadAll(() => new SampleAlternative(from.ReadString(), from.ReadInt32(), from.ReadInt32())),
        from.ReadAll(() => new Covariate(
            from.ReadString(), from.ReadText(), from.ReadAll(from.ReadInt32), [], from.ReadBoolean(), (CovariateRole)from.ReadInt32(), from.ReadNumber(),
            from.ReadNumber(), from.ReadInt32())),
        from.ReadAll(() => new LeftOut(from.ReadString(), from.ReadInt32())),
        from.ReadAll(() => new StockStart(from.ReadString(), from.ReadDouble(), from.ReadDouble())),
        from.ReadAll(() => new Caution(from.ReadString(), from.ReadString())))
    {
        Times = SituationTimes.Read(from),
        SecondCluster = from.ReadBoolean() ? CompactNumbers.Read(from) : null,
    };

    private static void Write(BinaryWriter to, StoredDesign design)
    {
        to.WriteAll(design.Layout.Parameters, p =>
        {
            to.Write(p.Name);
            to.WriteText(p.Alternative);
            to.Write((int)p.Kind);
            to.WriteNumber(p.Fixed);
            to.WriteNumber(p.Start);
            to.Write((int)p.Role);
        });
        to.Write(design.Layout.Coefficients);
        to.WriteAll(design.Layout.NodeParameter, to.Write);
        to.WriteAll(design.Layout.Nests, n =>
        {
            to.Write(n.Name);
            to.Write(n.Node);
            to.Write(n.Parameter);
            to.Write((int)n.Standing);
            to.Write(n.ParentNode);
            to.Write(n.WideSituations);
        });
        to.WriteAll(design.Columns, c =>
        {
            to.Write(c.Parameter);
            to.Write(c.Alternative);
            to.Write(c.Storage);
        });
        to.WriteAll(design.Format.Columns, c =>
        {
            to.Write((byte)c.Coding);
            to.Write((byte)c.Decimals);
        });
        to.Write(design.FirstByte);
        to.WriteAll(design.Checksums, to.Write);
    }

    private static StoredDesign ReadDesign(BinaryReader from, int alternatives)
    {
        var parameters = from.ReadAll(() => new ModelParameter(
            from.ReadString(), from.ReadText(), (ParameterKind)from.ReadInt32(), from.ReadNumber(), from.ReadNumber(), (CovariateRole)from.ReadInt32()));
        var coefficients = from.ReadInt32();
        var nodes = from.ReadAll(from.ReadInt32);
        var nests = from.ReadAll(() => new NestPlace(
            from.ReadString(), from.ReadInt32(), from.ReadInt32(), (NestStanding)from.ReadInt32(), from.ReadInt32(), from.ReadInt32()));
        var columns = from.ReadAll(() => new DesignColumn(from.ReadInt32(), from.ReadInt32(), from.ReadInt32()));
        var stored = from.ReadAll(() => new StoredColumn((ColumnCoding)from.ReadByte(), from.ReadByte()));
        return new StoredDesign(
            new ParameterLayout(parameters, coefficients, nodes, nests), columns, new BlockFormat(stored, alternatives), from.ReadInt64(),
            from.ReadAll(from.ReadUInt32));
    }
}
