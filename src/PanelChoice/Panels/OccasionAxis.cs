using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>The unit in which distances between occasions are measured.</summary>
public enum OccasionUnit
{
    /// <summary>Units of a whole-number occasion.</summary>
    WholeNumber,

    /// <summary>Calendar days.</summary>
    Day,

    /// <summary>Working days: without Saturdays, Sundays and the study's holidays.</summary>
    Workday,

    /// <summary>Weeks.</summary>
    Week,
}

/// <summary>Occasions as positions on a line, so that a distance in time is a difference of two numbers.</summary>
/// <param name="Position">Position of each occasion; <see cref="Off"/> for a date that the study's calendar of working days does not know.</param>
/// <param name="Step">Distance of two occasions without a gap between them, in positions.</param>
/// <param name="Unit">What a step is counted in.</param>
/// <param name="Rule">The history rule that looks back by exactly this step; null when there is none.</param>
internal sealed record OccasionAxis(long[] Position, long Step, OccasionUnit Unit, PreviousRule? Rule)
{
    /// <summary>Position of an occasion that is not on the line.</summary>
    public const long Off = long.MinValue;

    /// <summary>The line that the study's history rule measures on; where it looks at records or is not stated, the usual one.</summary>
    public static OccasionAxis Of(ChoicePanel panel, HistorySpecification history) => history.Previous switch
    {
        PreviousRule.Step => new OccasionAxis([.. panel.Occasion], 1, OccasionUnit.WholeNumber, history.Previous),
        PreviousRule.Day => new OccasionAxis([.. panel.Occasion], 1, OccasionUnit.Day, history.Previous),
        PreviousRule.Week => new OccasionAxis([.. panel.Occasion], 7, OccasionUnit.Week, history.Previous),
        PreviousRule.Workday => Workdays(panel, new WorkingCalendar(history.Holidays)),
        _ => Usual(panel, history.Holidays),
    };

    /// <summary>The line that the occasions of a whole panel themselves suggest (<see cref="UsualStep"/>).</summary>
    public static OccasionAxis Usual(ChoicePanel panel, ImmutableArray<DateOnly> holidays)
    {
        var usual = new UsualStep(holidays);
        usual.Observe(panel);
        return usual.AxisOf(panel);
    }

    /// <summary>Occasions numbered in working days.</summary>
    public static OccasionAxis Workdays(ChoicePanel panel, WorkingCalendar calendar) => new(
        [.. panel.Occasion.Select(day => calendar.IsWorkingDay(day) ? calendar.Number(day) : Off)], 1, OccasionUnit.Workday, PreviousRule.Workday);
}
