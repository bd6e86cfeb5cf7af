using PanelChoice.Diagnostics;
using PanelChoice.Findings;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>The words that stand for enumerations in machine-readable files.</summary>
internal static class JsonWords
{
    public static string Of(CovarianceKind kind) => PrecisionFindings.IdOf(kind);

    public static string Of(Verdict verdict) => verdict switch
    {
        Verdict.NoneFound => "none_found",
        Verdict.Dependence => "dependence",
        _ => "not_applicable",
    };

    public static string Of(DependenceCause cause) => cause switch
    {
        DependenceCause.Taste => "taste",
        DependenceCause.Habit => "habit",
        DependenceCause.HabitAndTaste => "habit_and_taste",
        DependenceCause.SerialErrors => "serial_errors",
        _ => "unclear",
    };

    public static string Of(FindingTopic topic) => topic.ToString().ToLowerInvariant();

    public static string Of(FindingSeverity severity) => severity.ToString().ToLowerInvariant();
}
