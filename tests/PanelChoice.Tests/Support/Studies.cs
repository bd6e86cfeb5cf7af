using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Tests.Support;

/// <summary>Study specifications without a file.</summary>
internal static class Studies
{
    public static StudySpecification With(HistorySpecification history, params TermSpecification[] terms) => new(
        "test", "study.toml", "", new string('0', 64),
        new PanelSource("diary.csv", "/diary.csv", "who", "day", "mode", "took", null, null, null),
        history, [], [.. terms],
        new EstimateSettings(NestedLogitForm.UtilityScaled, 1, 7),
        new InferenceSettings("person", 0.95, JackknifeKind.Off, 0, 7),
        new DiagnosticsSettings(5, 0.05, 999, 7));

    /// <summary>A history rule; holidays as ISO dates.</summary>
    public static HistorySpecification History(
        PreviousRule? previous, MissingHistory without = MissingHistory.Drop, int? longestGap = null, params string[] holidays) =>
        new(previous, [.. holidays.Select(h => DateOnly.FromDayNumber((int)Diary.Day(h)))], longestGap, without);

    public static TermSpecification Term(string name, TermSource source) =>
        new(name, source, ImmutableArray<string>.Empty, false, null, null, false, 1, null, null, 1);

    public static TermSpecification Column(string column, ColumnMoment? moment = null) =>
        Term(column, new ColumnSource(column, moment ?? new Now(), null, false, null));

    public static TermSpecification Each(this TermSpecification term, string? @base) => term with { Each = true, Base = @base };
}
