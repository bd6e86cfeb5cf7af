using System.Globalization;

namespace PanelChoice.Data;

/// <summary>
/// The column of occasions: whole numbers throughout, or dates throughout. What the first readable cell holds settles which; a later cell of
/// the other kind is a problem.
/// </summary>
/// <param name="file">The data file as the study writes it.</param>
/// <param name="name">Name of the column.</param>
/// <param name="known">What the cells hold, when the column is read again; none at the first reading.</param>
internal sealed class OccasionColumn(string file, string name, OccasionKind known) : ValueColumn<long>(file, name)
{
    private const string Remedy = "write every occasion as a whole number, or every one as a date like 2031-04-14";

    /// <summary>Occasions farther from 0 could lie so far apart that their distance is no whole number of 64 bits.</summary>
    private const long Farthest = 1L << 62;

    /// <summary>What the cells hold; none until one could be read.</summary>
    public OccasionKind Kind { get; private set; } = known;

    public override void Whole(CellPlace at, long value)
    {
        if (!Fits(OccasionKind.WholeNumber)) RejectMixed(at, value.ToString(CultureInfo.InvariantCulture), "is a whole number where the rows above hold dates");
        if (value is < -Farthest or > Farthest)
            Reject(
                "data.occasion_out_of_range", at, value.ToString(CultureInfo.InvariantCulture), "is too large for an occasion",
                "number the occasions from 1, or write them as dates like 2031-04-14");
        Values.Add(value);
    }

    public override void Number(CellPlace at, double value)
    {
        if (CellText.IsWhole(value, out var whole)) Whole(at, whole);
        else if (double.IsNaN(value)) Empty(at);
        else RejectNeither(at, CellText.Of(value), "is neither a whole number nor a date");
    }

    public override void Truth(CellPlace at, bool value) => RejectNeither(at, value ? "true" : "false", "is neither a whole number nor a date");

    public override void Moment(CellPlace at, DateTime value)
    {
        if (value.TimeOfDay == TimeSpan.Zero) Date(at, DateOnly.FromDateTime(value));
        else RejectNeither(at, Shown(value), "is a date with a time of day");
    }

    public override void Empty(CellPlace at)
    {
        RejectEmpty(at, Remedy);
        Values.Add(0);
    }

    protected override void Written(CellPlace at, ReadOnlySpan<byte> utf8)
    {
        if (CellText.TryWhole(utf8, out var whole)) Whole(at, whole);
        else if (CellText.TryDate(utf8, out var date)) Date(at, date);
        else if (CellText.TryNumber(utf8, out var number) && CellText.IsWhole(number, out whole)) Whole(at, whole);
        else RejectNeither(at, Shown(utf8), "is neither a whole number nor a date like 2031-04-14");
    }

    private void Date(CellPlace at, DateOnly value)
    {
        if (!Fits(OccasionKind.Date))
            RejectMixed(at, value.ToString("yyyy-MM-dd", CultureInfo.InvariantCulture), "is a date where the rows above hold whole numbers");
        Values.Add(value.DayNumber);
    }

    private bool Fits(OccasionKind kind)
    {
        if (Kind == OccasionKind.None) Kind = kind;
        return Kind == kind;
    }

    private void RejectMixed(CellPlace at, string value, string what) => Reject("data.mixed_occasions", at, value, what, Remedy);

    private void RejectNeither(CellPlace at, string value, string what)
    {
        Reject("data.occasion_not_date_or_whole", at, value, what, Remedy);
        Values.Add(0);
    }
}
