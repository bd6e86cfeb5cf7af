namespace PanelChoice.Likelihood;

/// <summary>
/// Where the products of one child's rows belong. The right rows are the covariates of an alternative, or the derivatives of a node's inner
/// value. The left rows are the right ones times the child's weight (of these products only the lower triangle counts), then for each constant
/// of an alternative the weight itself, then, where the node above has a dissimilarity, the factors of the cross terms with it.
/// </summary>
internal sealed class HessianPanel
{
    /// <summary>Left rows in a block of products.</summary>
    public const int BlockRows = 4;

    private readonly int[] slots;

    /// <summary>A panel.</summary>
    /// <param name="sums">Numbers the sums.</param>
    /// <param name="right">Parameters of the right rows, ascending.</param>
    /// <param name="constants">Parameters of the constants.</param>
    /// <param name="cross">Dissimilarity of the node above; -1 where there is none.</param>
    public HessianPanel(HessianSums sums, int[] right, int[] constants, int cross)
    {
        RightRows = right.Length;
        Constants = constants;
        Cross = cross;
        LeftRows = right.Length + constants.Length + (cross >= 0 ? 1 : 0);
        var padded = (LeftRows + BlockRows - 1) / BlockRows * BlockRows;
        slots = new int[padded * RightRows];
        Array.Fill(slots, sums.Unused);
        for (var c = 0; c < RightRows; c++)
        {
            for (var r = c; r < RightRows; r++) slots[(r * RightRows) + c] = sums.Slot(right[r], right[c]);
            for (var i = 0; i < constants.Length; i++) slots[((RightRows + i) * RightRows) + c] = sums.Slot(constants[i], right[c]);
            if (cross >= 0) slots[(CrossRow * RightRows) + c] = sums.CrossSlot(cross, right[c]);
        }

        var blocks = new List<(int Row, int Column)>();
        for (var row = 0; row < padded; row += BlockRows)
            for (var column = 0; column < RightRows; column += 2)
                if (Enumerable.Range(row, BlockRows).Any(r => IsUsed(r, column) || (column + 1 < RightRows && IsUsed(r, column + 1))))
                    blocks.Add((row, column));
        Blocks = [.. blocks];

        bool IsUsed(int r, int c) => slots[(r * RightRows) + c] != sums.Unused;
    }

    /// <summary>Number of right rows.</summary>
    public int RightRows { get; }

    /// <summary>Number of left rows.</summary>
    public int LeftRows { get; }

    /// <summary>Parameters of the constants.</summary>
    public int[] Constants { get; }

    /// <summary>Dissimilarity of the node above; -1 where there is none.</summary>
    public int Cross { get; }

    /// <summary>Left row of the cross terms.</summary>
    public int CrossRow => RightRows + Constants.Length;

    /// <summary>First left and right row of each block of 4 x 2 products of which at least one counts.</summary>
    public (int Row, int Column)[] Blocks { get; }

    /// <summary>The sum to which a product belongs.</summary>
    public int SlotOf(int leftRow, int rightRow) => slots[(leftRow * RightRows) + rightRow];
}
