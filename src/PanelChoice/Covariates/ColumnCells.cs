using PanelChoice.Panels;

namespace PanelChoice.Covariates;

/// <summary>
/// Columns laid over the panel's cells (<c>occasion * J + alternative</c>), transformed; each is made once. Not a number where the alternative
/// has no row, where the cell is empty, and where the logarithm of the value does not exist.
/// </summary>
internal sealed class ColumnCells(ChoicePanel panel)
{
    private readonly Dictionary<(string Column, bool Log, string? Level), double[]> made = [];

    /// <summary>A numeric column as it stands.</summary>
    public double[] Of(string column) => Of(column, false, null);

    /// <summary>A column as a term reads it: the logarithm taken, or a text value turned into 1 and the others into 0.</summary>
    public double[] Of(string column, bool log, string? level)
    {
        if (made.TryGetValue((column, log, level), out var cells)) return cells;
        cells = level is null ? Numbers(column, log) : Indicator(column, level);
        made[(column, log, level)] = cells;
        return cells;
    }

    private double[] Numbers(string column, bool log)
    {
        var values = panel.Table.Numbers[column].AsSpan();
        var rows = panel.Row.AsSpan();
        var cells = new double[rows.Length];
        for (var c = 0; c < cells.Length; c++)
        {
            var value = rows[c] < 0 ? double.NaN : values[rows[c]];
            cells[c] = !log ? value : value > 0 ? Math.Log(value) : double.NaN;
        }

        return cells;
    }

    private double[] Indicator(string column, string level)
    {
        var text = panel.Table.Texts[column];
        var wanted = text.Levels.IndexOf(level);
        var empty = text.Levels.IndexOf("");
        var codes = text.Codes.AsSpan();
        var rows = panel.Row.AsSpan();
        var cells = new double[rows.Length];
        for (var c = 0; c < cells.Length; c++)
            cells[c] = rows[c] < 0 || codes[rows[c]] == empty ? double.NaN : codes[rows[c]] == wanted ? 1 : 0;
        return cells;
    }
}
