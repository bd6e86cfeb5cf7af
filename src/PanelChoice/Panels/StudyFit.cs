using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>Whether the study's names and rules fit the panel that was read.</summary>
internal static class StudyFit
{
    /// <summary>Notes every alternative that the study names and the data do not have, and every history rule that the occasions cannot serve.</summary>
    public static void Check(StudySpecification study, ImmutableArray<string> alternatives, OccasionKind occasionKind, ProblemList problems)
    {
        CheckAlternatives(study, alternatives, problems);
        CheckHistory(study, occasionKind, problems);
    }

    private static void CheckAlternatives(StudySpecification study, ImmutableArray<string> alternatives, ProblemList problems)
    {
        foreach (var problem in NestTreeBuilder.Build(study, alternatives).Problems) problems.Add(problem);
        foreach (var term in study.Terms)
        {
            foreach (var name in term.Alternatives) Require(name, term, "term");
            if (term.Base is { } baseline) Require(baseline, term, "base of the term");
        }

        void Require(string name, TermSpecification term, string part)
        {
            if (alternatives.Contains(name)) return;
            problems.Add(new Problem(
                "study.unknown_alternative", study.File, $"the {part} '{term.Name}' names an alternative that {study.Panel.File} does not have",
                ClosestName.Remedy(name, alternatives)) { Line = term.Line, Value = name });
        }
    }

    private static void CheckHistory(StudySpecification study, OccasionKind kind, ProblemList problems)
    {
        if (kind == OccasionKind.None) return;
        var (word, needs) = study.History.Previous switch
        {
            PreviousRule.Step => ("step", OccasionKind.WholeNumber),
            PreviousRule.Day => ("day", OccasionKind.Date),
            PreviousRule.Workday => ("workday", OccasionKind.Date),
            PreviousRule.Week => ("week", OccasionKind.Date),
            _ => ("", kind),
        };
        if (needs == kind) return;
        var isDate = kind == OccasionKind.Date;
        problems.Add(new Problem(
            "study.previous_does_not_fit", study.File,
            $"this rule needs occasions that are {(isDate ? "whole numbers" : "dates")}, and column '{study.Panel.Occasion}' of {study.Panel.File} holds {(isDate ? "dates" : "whole numbers")}",
            isDate ? "use previous = \"day\", \"workday\", \"week\" or \"recorded\"" : "use previous = \"step\" or \"recorded\", or write the occasions as dates like 2031-04-14")
        {
            Line = LineOfPrevious(study.Text),
            Value = word,
        });
    }

    /// <summary>Line of <c>previous</c> in the study file's text, which the history record does not carry; null when it is not found.</summary>
    private static int? LineOfPrevious(string text)
    {
        var lines = text.ReplaceLineEndings("\n").Split('\n');
        var table = Array.FindIndex(lines, line => line.TrimStart().StartsWith("[history]", StringComparison.Ordinal));
        var found = table < 0 ? -1 : Array.FindIndex(lines, table, line => line.TrimStart().StartsWith("previous", StringComparison.Ordinal));
        return found < 0 ? null : found + 1;
    }
}
