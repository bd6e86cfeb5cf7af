using System.Collections.Immutable;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>Resolves what the study's terms name against the data: alternatives, base, text values; writes out <c>levels</c>.</summary>
internal sealed class TermPlanner(StudySpecification study, ChoicePanel panel, List<Problem> problems)
{
    /// <summary>One planned term for each term, or for each level of it; a term with a problem is not planned.</summary>
    public ImmutableArray<PlannedTerm> Plan(ImmutableArray<TermSpecification> terms)
    {
        var planned = new List<PlannedTerm>();
        for (var i = 0; i < terms.Length; i++)
        {
            var before = problems.Count;
            var applies = Applies(terms[i]);
            var levels = Levels(terms[i]);
            CheckTimes(terms[i]);
            if (problems.Count > before) continue;
            foreach (var level in levels)
            {
                var name = terms[i].Source is ColumnSource { Levels: true } ? $"{terms[i].Name}: {level}" : terms[i].Name;
                planned.Add(new PlannedTerm(terms[i], i, name, level, applies));
            }
        }

        foreach (var twice in planned.GroupBy(p => p.Name, StringComparer.Ordinal).Where(g => g.Count() > 1))
            Report(twice.Last().Specification, "term.name_twice", $"two coefficients would be called '{twice.Key}'", "rename one of the terms");
        return [.. planned];
    }

    private ImmutableArray<int> Applies(TermSpecification term)
    {
        var all = !term.Alternatives.IsDefaultOrEmpty;
        var applies = new SortedSet<int>();
        foreach (var name in all ? term.Alternatives : panel.Alternatives)
            if (Resolve(term, name, "alternatives") is { } index) applies.Add(index);
        if (term.Base is { } baseName && Resolve(term, baseName, "base") is { } baseIndex) applies.Remove(baseIndex);
        if (applies.Count == 0 && term.Alternatives.All(panel.Alternatives.Contains))
            Report(term, "term.no_alternative", $"term '{term.Name}' is left without any alternative", "name one besides the base");
        return [.. applies];
    }

    private int? Resolve(TermSpecification term, string name, string key)
    {
        var index = panel.Alternatives.IndexOf(name);
        if (index >= 0) return index;
        Report(
            term, "study.unknown_alternative", $"term '{term.Name}' names '{name}' under {key}, which is no alternative of the data",
            ClosestName.Remedy(name, panel.Alternatives));
        return null;
    }

    /// <summary>The text values to make indicators for; one null for a term without any.</summary>
    private List<string?> Levels(TermSpecification term)
    {
        if (term.Source is not ColumnSource column) return [null];
        if (column.Is is null && !column.Levels)
        {
            if (!panel.Table.Numbers.ContainsKey(column.Column)) ReportColumn(term, column.Column, "numbers");
            return [null];
        }

        if (!panel.Table.Texts.TryGetValue(column.Column, out var text))
        {
            ReportColumn(term, column.Column, "text");
            return [];
        }

        // An empty cell, possible on rows that were not offered, is no value of its own.
        var values = text.Levels.Where(v => v.Length > 0).ToList();
        if ((column.Is ?? column.Omit) is { } named && !values.Contains(named, StringComparer.Ordinal))
        {
            var key = column.Is is null ? "omit" : "is";
            problems.Add(new Problem(
                "term.unknown_value", study.File, $"term '{term.Name}' names '{named}' under {key}, which column '{column.Column}' never holds",
                ClosestName.Remedy(named, values))
            {
                Line = term.Line,
            });
            return [];
        }

        if (!column.Levels) return [column.Is];
        List<string?> levels = [.. values.Where(v => v != column.Omit)];
        if (levels.Count == 0)
            Report(term, "term.one_level", $"column '{column.Column}' holds no value besides the omitted one", "take the term out");
        return levels;
    }

    private void CheckTimes(TermSpecification term)
    {
        if (term.Times is { } times && !panel.Table.Numbers.ContainsKey(times)) ReportColumn(term, times, "numbers");
    }

    private void ReportColumn(TermSpecification term, string column, string kind) => Report(
        term, "term.unknown_column", $"term '{term.Name}' needs column '{column}' as {kind}, which the data do not give", "name a column of the data file");

    private void Report(TermSpecification term, string id, string what, string remedy) =>
        problems.Add(new Problem(id, study.File, what, remedy) { Line = term.Line });
}
