using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Diagnostics;

namespace PanelChoice.Findings;

/// <summary>The verdict in words. A panel in which nothing is found is never called independent.</summary>
internal static class IndependenceFindings
{
    public static IEnumerable<Finding> Of(FindingsInput input)
    {
        var diagnostics = input.Diagnostics;
        yield return diagnostics.Verdict switch
        {
            Verdict.NotApplicable => new Finding(
                "independence.not_applicable", FindingTopic.Independence, FindingSeverity.Notice,
                diagnostics.Reason ?? "Independence was not tested.", []),
            Verdict.NoneFound => new Finding(
                "independence.none_found", FindingTopic.Independence, FindingSeverity.Information,
                $"No sign of dependence was found{Detector(diagnostics)}. That is no proof of its absence.",
                Figures(diagnostics)),
            _ => new Finding("independence.dependence", FindingTopic.Independence, FindingSeverity.Warning, Dependence(input), Figures(diagnostics)),
        };

        if (diagnostics is { Verdict: Verdict.Dependence, Cause: not null, HitRate: { } rate })
            yield return new Finding(
                "independence.hit_rate", FindingTopic.Independence, FindingSeverity.Notice,
                "How far to trust the cause: the rule that names it was "
                + (rate.Source.StartsWith("right", StringComparison.Ordinal) ? "" : $"right in {PlainNumber.PercentInWords(rate.Rate)} of ")
                + rate.Source.TrimEnd('.') + ".",
                [new FindingFigure("rate", rate.Rate)]);
        for (var i = 0; i < diagnostics.Notes.Length; i++)
            yield return new Finding("independence.note", FindingTopic.Independence, FindingSeverity.Notice, diagnostics.Notes[i], []);
    }

    private static string Dependence(FindingsInput input)
    {
        var diagnostics = input.Diagnostics;
        var days = diagnostics.CommonDays == true;
        if (diagnostics.Cause is not { } cause)
            return days
                ? $"Dependence was found: people are moved by the same days{DateScore(diagnostics)}. Persons cannot be taken as independent of each other on a day."
                : $"Dependence was found{Detector(diagnostics)}; its cause cannot be told.";
        var words = cause == DependenceCause.Unclear
            ? $"Dependence was found{Detector(diagnostics)}: one person's occasions are not independent evidence. Its cause cannot be told from these data."
            : $"Dependence was found{Detector(diagnostics)}: one person's occasions are not independent evidence. Its likely cause is {InWords(cause, input)}.";
        return words + (days ? $" Besides, people are moved by the same days{DateScore(diagnostics)}." : "");
    }

    private static string InWords(DependenceCause cause, FindingsInput input) => cause switch
    {
        DependenceCause.Taste => "lasting taste: the same people go on preferring the same alternatives beyond what the terms explain",
        // The rule sees habit in a fit without past choices, so with a habit term in the model it cannot mean that habit was left out.
        DependenceCause.Habit when input.Layout.Parameters.Any(p => p.Role == CovariateRole.PastChoice) =>
            "habit that works in another way than the habit terms say: a longer memory, or one that differs between alternatives",
        DependenceCause.Habit => "habit that the terms do not hold: what was taken before acts on what is taken now",
        DependenceCause.HabitAndTaste => "habit and lasting taste together",
        _ => "shocks that fade slowly: conditions outside the data that last from one occasion to the next",
    };

    private static string Detector(DiagnosticsResult diagnostics) =>
        diagnostics.Detector is { } detector ? $" (detector {PlainNumber.PValueInWords(detector.PValue)})" : "";

    private static string DateScore(DiagnosticsResult diagnostics) =>
        diagnostics.DateScore is { } score ? $" (date score {PlainNumber.PValueInWords(score.PValue)})" : "";

    private static ImmutableArray<FindingFigure> Figures(DiagnosticsResult diagnostics)
    {
        var figures = ImmutableArray.CreateBuilder<FindingFigure>();
        if (diagnostics.Detector is { } detector)
        {
            figures.Add(new FindingFigure("detector", detector.Statistic));
            figures.Add(new FindingFigure("detector p", detector.PValue));
        }

        if (diagnostics.DateScore is { } score)
        {
            figures.Add(new FindingFigure("date score", score.Z));
            figures.Add(new FindingFigure("date score p", score.PValue));
        }

        return figures.ToImmutable();
    }
}
