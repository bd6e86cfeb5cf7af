using System.Text;
using PanelChoice.Study;

namespace PanelChoice.Data;

/// <summary>Where a cell stands.</summary>
/// <param name="Row">Row number of the file.</param>
/// <param name="IsOffered">Whether the row's alternative was available; where it was not, an attribute may be empty.</param>
internal readonly record struct CellPlace(long Row, bool IsOffered);

/// <summary>
/// One column of the table while it is read: takes cells in the order of the file in whatever form the file holds them, and keeps what the
/// column is for. Every call adds exactly one entry, also where the cell is a problem, so that columns stay in step.
/// </summary>
/// <param name="file">The data file as the study writes it.</param>
/// <param name="name">Name of the column.</param>
internal abstract class CellColumn(string file, string name)
{
    private const int LongestValueShown = 60;

    /// <summary>Name of the column.</summary>
    public string Name => name;

    /// <summary>What is wrong with its cells.</summary>
    public ProblemList Problems { get; } = new();

    /// <summary>Adds a cell written as text.</summary>
    /// <param name="at">Where it stands.</param>
    /// <param name="utf8">The text without quotes; blanks around it do not count.</param>
    public void Text(CellPlace at, ReadOnlySpan<byte> utf8)
    {
        var trimmed = utf8.Trim(" \t"u8);
        if (trimmed.IsEmpty) Empty(at);
        else Written(at, trimmed);
    }

    /// <summary>Adds a whole number.</summary>
    public abstract void Whole(CellPlace at, long value);

    /// <summary>Adds a number, which may be NaN or infinite.</summary>
    public abstract void Number(CellPlace at, double value);

    /// <summary>Adds a truth value.</summary>
    public abstract void Truth(CellPlace at, bool value);

    /// <summary>Adds a date, or a date with a time of day.</summary>
    public abstract void Moment(CellPlace at, DateTime value);

    /// <summary>Adds an empty cell.</summary>
    public abstract void Empty(CellPlace at);

    /// <summary>Makes room for more cells.</summary>
    public abstract void Reserve(int more);

    /// <summary>Drops the first entries; what was wrong with them stays noted.</summary>
    public abstract void Forget(int count);

    /// <summary>Bytes of an entry that <see cref="Store"/> writes.</summary>
    public abstract int StoredBytes { get; }

    /// <summary>Writes an entry, so that it can be added again with <see cref="Restore"/>.</summary>
    public abstract void Store(int index, Span<byte> to);

    /// <summary>Adds an entry that <see cref="Store"/> wrote.</summary>
    public abstract void Restore(ReadOnlySpan<byte> from);

    /// <summary>Adds a cell written as text that is not blank.</summary>
    protected abstract void Written(CellPlace at, ReadOnlySpan<byte> utf8);

    /// <summary>Notes a bad cell.</summary>
    protected void Reject(string id, CellPlace at, string? value, string what, string remedy)
    {
        if (!Problems.Count(id)) return;
        var shown = value is { Length: > LongestValueShown } ? value[..LongestValueShown] + "..." : value;
        Problems.List(new Problem(id, file, what, remedy) { Row = at.Row, Column = name, Value = shown });
    }

    /// <summary>Notes a cell that may not be empty.</summary>
    protected void RejectEmpty(CellPlace at, string remedy) => Reject("data.empty_cell", at, null, "the cell is empty", remedy);

    /// <summary>The text of a cell for a message; bytes that are no text show as replacement characters.</summary>
    protected static string Shown(ReadOnlySpan<byte> utf8) => Encoding.UTF8.GetString(utf8);

    /// <summary>A date as ISO 8601 writes it, with the time of day where there is one.</summary>
    protected static string Shown(DateTime value) =>
        value.ToString(value.TimeOfDay == TimeSpan.Zero ? "yyyy-MM-dd" : "yyyy-MM-dd'T'HH:mm:ss.FFFFFFF", System.Globalization.CultureInfo.InvariantCulture);
}
