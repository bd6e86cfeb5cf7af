using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>The reasons for which an occasion is left out, in plain words.</summary>
/// <param name="history">The study's rule.</param>
/// <param name="kind">What the occasion column holds, which gives distances their unit.</param>
internal sealed class HistoryWords(HistorySpecification history, OccasionKind kind)
{
    /// <summary>A date that the working calendar does not know.</summary>
    public const string OutsideCalendar = "dated on a week-end or holiday, which the workday rule does not know";

    /// <summary>Nothing to choose.</summary>
    public const string OneAlternative = "only one alternative offered";

    /// <summary>A person's first recorded occasion in a study that looks back.</summary>
    public const string FirstOccasion = "first recorded occasion of the person: nothing to look back to";

    /// <summary>No record at the distance that the source looks at.</summary>
    public string NoRecord(TermSource source)
    {
        if (TermDirection.StepsAhead(source) is { } ahead) return $"no future: no record {Later(ahead)}";
        if (TermDirection.StepsBack(source) is not { } back) return FirstOccasion;
        if (history.Previous is not (null or PreviousRule.Recorded)) return $"no history: no record {Earlier(back)}";
        var unit = kind == OccasionKind.Date ? "days" : "units of occasion";
        return (back, history.LongestGap) switch
        {
            (1, { } longest) => $"no history: the previous recorded occasion lies more than {longest} {unit} back",
            (_, { } longest) => $"no history: no {back} recorded occasions before it within {longest} {unit}",
            _ => $"no history: fewer than {back} recorded occasions before it",
        };
    }

    /// <summary>A record at that distance which does not hold the alternative's value.</summary>
    public string NoValue(ColumnSource source, string alternative) => TermDirection.StepsAhead(source) is { } ahead
        ? $"no future: no {source.Column} of '{alternative}' {Later(ahead)}"
        : $"no history: no {source.Column} of '{alternative}' {Earlier(TermDirection.StepsBack(source)!.Value)}";

    /// <summary>How far back, as the end of a sentence.</summary>
    public string Earlier(int k) => (history.Previous, k) switch
    {
        (PreviousRule.Step, 1) => "one step earlier",
        (PreviousRule.Step, _) => $"{k} steps earlier",
        (PreviousRule.Day, 1) => "on the day before",
        (PreviousRule.Day, _) => $"{k} days before",
        (PreviousRule.Workday, 1) => "on the working day before",
        (PreviousRule.Workday, _) => $"{k} working days before",
        (PreviousRule.Week, 1) => "one week before",
        (PreviousRule.Week, _) => $"{k} weeks before",
        (_, 1) => "at the previous recorded occasion",
        _ => $"{k} recorded occasions before",
    };

    private string Later(int k) => (history.Previous, k) switch
    {
        (PreviousRule.Step, 1) => "one step later",
        (PreviousRule.Step, _) => $"{k} steps later",
        (PreviousRule.Day, 1) => "on the day after",
        (PreviousRule.Day, _) => $"{k} days after",
        (PreviousRule.Workday, 1) => "on the working day after",
        (PreviousRule.Workday, _) => $"{k} working days after",
        (PreviousRule.Week, 1) => "one week after",
        (PreviousRule.Week, _) => $"{k} weeks after",
        (_, 1) => "at a next recorded occasion",
        _ => $"{k} recorded occasions after",
    };
}
