using PanelChoice.Findings;
using PanelChoice.Results;

namespace PanelChoice.Cli.Report;

/// <summary>Who was read, who was left out and why, what was offered and chosen.</summary>
internal static class SampleSection
{
    public static void AddTo(Letter letter, SampleSummary sample)
    {
        letter.Paragraph(
            $"Read: {PlainNumber.Counted(sample.RowsRead, "row")}, that is {PlainNumber.Counted(sample.OccasionsRead, "occasion")} of "
            + $"{PlainNumber.Counted(sample.PersonsRead, "person")}. Used: {PlainNumber.Counted(sample.Occasions, "occasion")} of "
            + $"{PlainNumber.Counted(sample.Persons, "person")}. "
            + (sample.LeftOut.Sum(l => l.Occasions) > 0 ? "Left out:" : "None is left out."));
        var leftOut = sample.LeftOut.Where(l => l.Occasions > 0).ToList();
        if (leftOut.Count > 0)
        {
            letter.Gap();
            letter.Table(
                [new TableColumnPlan("occasions"), new TableColumnPlan("why left out", IsNumber: false)],
                leftOut.Select(l => new[] { PlainNumber.Count(l.Occasions), l.Reason }));
        }

        letter.Gap();
        letter.Table(
            [
                new TableColumnPlan("alternative", IsNumber: false), new TableColumnPlan("offered"), new TableColumnPlan("chosen"),
                new TableColumnPlan("share of all"), new TableColumnPlan("where offered"),
            ],
            sample.Alternatives.Select(a => new[]
            {
                a.Name, PlainNumber.Count(a.Offered), PlainNumber.Count(a.Chosen), PlainNumber.Percent((double)a.Chosen / Math.Max(1, sample.Occasions)),
                a.Offered > 0 ? PlainNumber.Percent((double)a.Chosen / a.Offered) : "never",
            }));
    }
}
