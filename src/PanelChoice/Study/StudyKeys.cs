using System.Collections.Frozen;

namespace PanelChoice.Study;

/// <summary>The vocabulary of the study file: its tables, their keys, and what is planned but not there yet.</summary>
internal static class StudyKeys
{
    /// <summary>The head of the file, before the first table.</summary>
    public const string Head = "";

    private const string Term = "[[term]]";

    /// <summary>The keys that may be the source of a term.</summary>
    public static readonly string[] Sources = ["column", "constant", "last_choice", "last_nest", "stock", "past_share", "first_choice"];

    /// <summary>The keys that say at which occasion a column is read.</summary>
    public static readonly string[] Moments = ["lag", "lead", "change", "person_mean", "chosen_then"];

    private static readonly FrozenDictionary<string, string[]> Keys = new Dictionary<string, string[]>
    {
        [Head] = ["title"],
        ["[panel]"] = ["file", "layout", "person", "occasion", "alternative", "chosen", "offered", "weight", "shared_calendar"],
        ["[history]"] = ["previous", "holidays", "longest_gap", "without_history"],
        ["[[nest]]"] = ["name", "members", "dissimilarity", "same_as"],
        [Term] =
        [
            "name", .. Sources, .. Moments, "is", "levels", "omit", "alternatives", "each", "base", "times", "transform", "scale", "fixed", "start",
        ],
        ["[[test]]"] = ["name", "terms", "values", "equal"],
        ["[estimate]"] = ["form", "starts", "seed"],
        ["[inference]"] = ["cluster", "second_cluster", "confidence", "jackknife", "score_draws"],
        ["[inference.bootstrap]"] = ["replicates", "blocks", "length", "draw", "target", "studentised", "seed"],
        ["[diagnostics]"] = ["lags", "level", "draws", "seed"],
    }.ToFrozenDictionary();

    // What a later version reads: refused by name rather than called unknown.
    private static readonly FrozenDictionary<(string Table, string Key), string> LaterKeys = new Dictionary<(string, string), string>
    {
        [("[panel]", "alternatives")] = "it belongs to the wide layout; bring the data into long layout, a row for each person, occasion and alternative",
    }.ToFrozenDictionary();

    private static readonly string[] LaterTables = ["[[taste]]", "[initial]"];

    /// <summary>Reports every key of a table that the table does not have.</summary>
    /// <param name="table">The table.</param>
    /// <param name="name">Its name with brackets.</param>
    /// <param name="inner">Keys that are tables of their own and are looked at elsewhere.</param>
    /// <param name="problems">Where problems go.</param>
    public static void Check(TomlTable table, string name, IEnumerable<string> inner, StudyProblems problems)
    {
        var known = Keys[name];
        foreach (var entry in table.Entries.Where(e => !known.Contains(e.Key) && !inner.Contains(e.Key)))
            if (LaterKeys.TryGetValue((name, entry.Key), out var remedy))
                problems.Add("study.not_supported", entry.Place, $"'{entry.Key}' in {name} is not supported yet", remedy);
            else if (entry.Value is TomlTable || (entry.Value is TomlList list && list.Items.Any(i => i is TomlTable)))
                UnknownTable(entry, name, problems);
            else
                UnknownKey(entry, name, known, problems);
    }

    private static void UnknownKey(TomlEntry entry, string name, string[] known, StudyProblems problems)
    {
        var close = ClosestName.Of(entry.Key, known);
        var elsewhere = Keys.Where(t => t.Key != name && t.Value.Contains(entry.Key)).Select(t => t.Key).Order(StringComparer.Ordinal).ToList();
        var remedies = new List<string>();
        if (elsewhere.Contains(Head))
            remedies.Add($"'{entry.Key}' belongs at the head of the file, before the first table");
        else if (elsewhere.Count > 0)
            remedies.Add($"'{entry.Key}' belongs in {string.Join(" or ", elsewhere)}; a key belongs to the last table header above it");
        if (close is not null) remedies.Add($"did you mean '{close}'?");
        if (remedies.Count == 0 && known.Length > 0) remedies.Add($"use one of: {string.Join(", ", known)}");
        problems.Add(
            "study.unknown_key", entry.Place, $"{(name == Head ? "the head of the file" : name)} has no key '{entry.Key}'", string.Join("; or ", remedies));
    }

    private static void UnknownTable(TomlEntry entry, string parent, StudyProblems problems)
    {
        var path = parent == Head ? entry.Key : $"{parent.Trim('[', ']')}.{entry.Key}";
        var shown = entry.Value is TomlList ? $"[[{path}]]" : $"[{path}]";
        if (LaterTables.FirstOrDefault(t => t.Trim('[', ']') == path) is { } later)
        {
            problems.Add("study.not_supported", entry.Place, $"{later} is not supported yet", "remove it");
            return;
        }

        var tables = Keys.Keys.Where(k => k != Head).Order(StringComparer.Ordinal).ToList();
        var close = ClosestName.Of(path, tables.Select(t => t.Trim('[', ']'))) is { } name
            ? tables.First(t => t.Trim('[', ']') == name)
            : tables.FirstOrDefault(t => t.Trim('[', ']').Split('.')[^1] == entry.Key);
        problems.Add(
            "study.unknown_table", entry.Place, $"there is no table {shown}",
            close is null ? $"use one of: {string.Join(", ", tables)}" : $"did you mean {close}?");
    }
}
