using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>
/// The unit in which the occasions of a panel suggest that distances be measured, learnt part by part. The step is the largest one that divides every
/// distance within persons, so that a survey taken every second year has no gaps; dates that all are working days are counted in working days.
/// </summary>
/// <param name="holidays">Dates that are no working days besides Saturdays and Sundays.</param>
internal sealed class UsualStep(ImmutableArray<DateOnly> holidays)
{
    private readonly WorkingCalendar calendar = new(holidays);
    private long common;
    private bool areWorkingDays = true;

    /// <summary>Looks at a part of the panel.</summary>
    public void Observe(ChoicePanel part)
    {
        for (var o = 1; o < part.Occasions; o++)
            if (part.PersonOf[o] == part.PersonOf[o - 1]) common = CommonDivisor(part.Occasion[o] - part.Occasion[o - 1], common);
        if (areWorkingDays && part.Table.OccasionKind == OccasionKind.Date) areWorkingDays = part.Occasion.All(calendar.IsWorkingDay);
    }

    /// <summary>The line on which a part lies, once all parts were looked at.</summary>
    public OccasionAxis AxisOf(ChoicePanel part)
    {
        var isDate = part.Table.OccasionKind == OccasionKind.Date;
        if (common == 0) return new OccasionAxis([.. part.Occasion], 1, isDate ? OccasionUnit.Day : OccasionUnit.WholeNumber, null);
        if (!isDate) return new OccasionAxis([.. part.Occasion], common, OccasionUnit.WholeNumber, common == 1 ? PreviousRule.Step : null);
        if (common % 7 == 0) return new OccasionAxis([.. part.Occasion], common, OccasionUnit.Week, common == 7 ? PreviousRule.Week : null);
        return areWorkingDays
            ? OccasionAxis.Workdays(part, calendar)
            : new OccasionAxis([.. part.Occasion], 1, OccasionUnit.Day, PreviousRule.Day);
    }

    private static long CommonDivisor(long a, long b) => b == 0 ? a : CommonDivisor(b, a % b);
}
