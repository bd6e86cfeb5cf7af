using PanelChoice.Covariates;

namespace PanelChoice.Design;

/// <summary>Takes the blocks of a design one after the other.</summary>
internal interface IBlockSink
{
    /// <summary>Makes room for the next block.</summary>
    /// <param name="lanes">Its lanes.</param>
    /// <returns>The block's bytes, all 0, to be filled before the next call.</returns>
    Span<byte> Append(int lanes);
}

/// <summary>Takes the blocks of a design and becomes the store that holds them.</summary>
internal interface IBlockTarget : IBlockSink
{
    /// <summary>The store, once all blocks are there.</summary>
    BlockStore Complete();
}

/// <summary>Fills the blocks of a planned design from covariates that come in parts of whole blocks.</summary>
/// <param name="plan">The plan.</param>
/// <param name="sink">Takes the blocks.</param>
internal sealed class DesignFiller(DesignPlan plan, IBlockSink sink)
{
    private double[] values = [];
    private int nextBlock;
    private int nextSituation;

    /// <summary>Fills the blocks of the next part.</summary>
    /// <param name="part">Its covariates, those of the plan.</param>
    /// <exception cref="ArgumentException">The part ends inside a block.</exception>
    public void Add(CovariateSet part)
    {
        var first = nextSituation;
        var end = first + part.Used.Length;
        for (; nextBlock < plan.Blocks.Length && plan.Blocks[nextBlock].FirstSituation < end; nextBlock++)
        {
            var block = plan.Blocks[nextBlock];
            nextSituation = block.FirstSituation + block.Situations;
            if (nextSituation > end) throw new ArgumentException("A part of a panel ends inside a block.", nameof(part));
            Fill(block, part, block.FirstSituation - first, sink.Append(block.Lanes));
        }
    }

    private void Fill(DesignBlock block, CovariateSet part, int from, Span<byte> bytes)
    {
        var panel = part.Panel;
        var used = part.Used.AsSpan(from, block.Situations);
        var alternatives = panel.Alternatives.Length;
        var offered = bytes[plan.Format.ColumnOffset(plan.Format.Columns.Length, block.Lanes)..];
        var chosen = bytes[plan.Format.ChosenOffset(block.Lanes)..];
        for (var lane = 0; lane < used.Length; lane++)
        {
            var mask = lane / ChoiceDesign.TileLanes * alternatives;
            var bit = (byte)(1 << (lane % ChoiceDesign.TileLanes));
            for (var j = 0; j < alternatives; j++)
                if (panel.Offered[(used[lane] * alternatives) + j]) offered[mask + j] |= bit;
            chosen[mask + panel.Chosen[used[lane]]] |= bit;
        }

        if (values.Length != block.Lanes) values = new double[block.Lanes];
        Array.Clear(values);
        foreach (var column in plan.Columns)
        {
            if (column.Storage < 0) continue;
            var covariate = part.Covariates[column.Parameter];
            var width = covariate.Enters.Length;
            var place = covariate.Enters.IndexOf(column.Alternative);
            for (var lane = 0; lane < used.Length; lane++)
            {
                var isOffered = panel.Offered[(used[lane] * alternatives) + column.Alternative];
                values[lane] = isOffered ? covariate.Values[((from + lane) * width) + place] : 0;
            }

            plan.Format.Encode(column.Storage, values, bytes);
        }
    }
}
