namespace PanelChoice.Data;

/// <summary>
/// A column of numbers: attributes, weights, factors. An empty cell (or NaN) is accepted on a row that was not offered and held as NaN;
/// true and false read as 1 and 0.
/// </summary>
internal sealed class NumberColumn(string file, string name) : ValueColumn<double>(file, name)
{
    public override void Whole(CellPlace at, long value) => Values.Add(value);

    public override void Number(CellPlace at, double value)
    {
        if (!double.IsFinite(value) && (at.IsOffered || double.IsInfinity(value))) RejectNotFinite(at, CellText.Of(value));
        Values.Add(value);
    }

    public override void Truth(CellPlace at, bool value) => Values.Add(value ? 1 : 0);

    public override void Moment(CellPlace at, DateTime value)
    {
        RejectNotANumber(at, Shown(value));
        Values.Add(double.NaN);
    }

    public override void Empty(CellPlace at)
    {
        if (at.IsOffered)
            RejectEmpty(at, "give the number; a cell may be empty only where the alternative was not offered");
        Values.Add(double.NaN);
    }

    protected override void Written(CellPlace at, ReadOnlySpan<byte> utf8)
    {
        if (CellText.TryNumber(utf8, out var value))
        {
            if (!double.IsFinite(value) && (at.IsOffered || double.IsInfinity(value))) RejectNotFinite(at, Shown(utf8));
        }
        else if (CellText.TryTruth(utf8, out var truth))
        {
            value = truth ? 1 : 0;
        }
        else
        {
            value = double.NaN;
            if (CellText.HasDecimalComma(utf8))
                Reject("data.not_a_number", at, Shown(utf8), "is written with a decimal comma", "write numbers with a decimal point, as in 12.5");
            else
                RejectNotANumber(at, Shown(utf8));
        }

        Values.Add(value);
    }

    private void RejectNotANumber(CellPlace at, string value) =>
        Reject("data.not_a_number", at, value, "is not a number", "write a plain number with a decimal point, as in 12.5; what is unknown cannot be used");

    private void RejectNotFinite(CellPlace at, string value) =>
        Reject("data.not_finite", at, value, "is not a finite number", "give the number; a cell may be empty only where the alternative was not offered");
}
