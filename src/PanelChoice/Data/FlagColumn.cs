using System.Globalization;

namespace PanelChoice.Data;

/// <summary>A column of yes and no: 1 or 0, true or false. A cell that is neither counts as <paramref name="otherwise"/> until the file is rejected.</summary>
internal sealed class FlagColumn(string file, string name, bool otherwise) : ValueColumn<bool>(file, name)
{
    private const string Remedy = "write 1 or true, 0 or false";

    /// <summary>The entry of a cell already added.</summary>
    public bool this[int index] => Values[index];

    /// <summary>Number of cells added.</summary>
    public int Count => Values.Count;

    public override void Whole(CellPlace at, long value) => Add(at, value is 0 or 1 ? value == 1 : null, value.ToString(CultureInfo.InvariantCulture));

    public override void Number(CellPlace at, double value) => Add(at, value is 0 or 1 ? value == 1 : null, CellText.Of(value));

    public override void Truth(CellPlace at, bool value) => Values.Add(value);

    public override void Moment(CellPlace at, DateTime value) => Add(at, null, Shown(value));

    public override void Empty(CellPlace at)
    {
        RejectEmpty(at, Remedy);
        Values.Add(otherwise);
    }

    protected override void Written(CellPlace at, ReadOnlySpan<byte> utf8)
    {
        if (CellText.TryTruth(utf8, out var truth)) Values.Add(truth);
        else if (CellText.TryNumber(utf8, out var number) && number is 0 or 1) Values.Add(number == 1);
        else Add(at, null, Shown(utf8));
    }

    private void Add(CellPlace at, bool? value, string shown)
    {
        if (value is null) Reject("data.not_boolean", at, shown, "says neither yes nor no", Remedy);
        Values.Add(value ?? otherwise);
    }
}
