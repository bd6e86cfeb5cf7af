using System.Collections.Immutable;

namespace PanelChoice.Panels;

/// <summary>Numbers the working days in a row, so that a distance in working days is a difference of two numbers.</summary>
/// <param name="holidays">Dates that are no working days besides Saturdays and Sundays.</param>
internal sealed class WorkingCalendar(ImmutableArray<DateOnly> holidays)
{
    // Day 0 (0001-01-01) is a Monday in the proleptic Gregorian calendar, so the remainder by 7 is the day of the week from Monday on.
    private const int DaysOfWeek = 7;
    private const int WorkingDaysOfWeek = 5;

    private readonly long[] closed = holidays.IsDefaultOrEmpty
        ? []
        : [.. holidays.Select(d => (long)d.DayNumber).Where(d => d % DaysOfWeek < WorkingDaysOfWeek).Distinct().Order()];

    /// <summary>Whether a day (days since 0001-01-01) is neither on a week-end nor a holiday.</summary>
    public bool IsWorkingDay(long day) => day % DaysOfWeek < WorkingDaysOfWeek && Array.BinarySearch(closed, day) < 0;

    /// <summary>Number of working days before a working day since 0001-01-01.</summary>
    public long Number(long day)
    {
        var closedBefore = ~Array.BinarySearch(closed, day);
        return (day / DaysOfWeek * WorkingDaysOfWeek) + (day % DaysOfWeek) - closedBefore;
    }
}
