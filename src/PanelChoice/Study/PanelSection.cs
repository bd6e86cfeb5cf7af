namespace PanelChoice.Study;

/// <summary>Reads <c>[panel]</c>: where the data are and which column is which.</summary>
internal static class PanelSection
{
    private static readonly string[] Endings = [".csv", ".csv.gz", ".parquet"];

    public static PanelSource Read(TableReader table, string studyPath, StudyProblems problems)
    {
        var file = table.NeededText("file", "write file = \"...\", relative to the study file");
        var full = "";
        if (file is not null)
        {
            if (!Endings.Any(e => file.EndsWith(e, StringComparison.OrdinalIgnoreCase)))
                problems.Add(
                    "study.unknown_value", table.PlaceOf("file"), "the data file is of no kind that can be read", $"use a file that ends in {string.Join(" or ", Endings)}", file);
            else if (file.Contains('\0', StringComparison.Ordinal))
                problems.Add("study.unknown_value", table.PlaceOf("file"), "the data file's name holds a character no file name can hold", "correct the name");
            else
                full = Path.GetFullPath(file, Path.GetDirectoryName(Path.GetFullPath(studyPath))!);
        }

        // A key without a sensible value has been reported; only a layout that is plainly wide changes what else is asked for.
        var wide = table.Word("layout", false, ("long", false), ("wide", true));
        if (wide)
            problems.Add(
                "study.not_supported", table.PlaceOf("layout"), "the wide layout is not supported yet",
                "bring the data into long layout, a row for each person, occasion and alternative");
        var person = table.NeededText("person", "name the column that holds the person's id");
        var occasion = table.Text("occasion");
        var alternative = wide ? table.Text("alternative") : table.NeededText("alternative", "name the column that holds the alternative's name");
        var chosen = table.NeededText("chosen", "name the column that is 1 on the chosen row");
        var offered = table.Text("offered");
        var weight = table.Text("weight");
        ReportSharedColumns(table, problems);
        var shared = table.OptionalFlag("shared_calendar");
        if (shared == true && !table.Has("occasion"))
            problems.Add(
                "study.needs_key", table.PlaceOf("shared_calendar"), "'shared_calendar' speaks of occasions, and [panel] names no 'occasion'", "name the column of the occasion or remove the key");
        return new PanelSource(file ?? "", full, person ?? "", occasion, alternative ?? "", chosen ?? "", offered, weight, shared);
    }

    private static void ReportSharedColumns(TableReader table, StudyProblems problems)
    {
        var seen = new Dictionary<string, string>(StringComparer.Ordinal);
        foreach (var role in (string[])["person", "occasion", "alternative", "chosen", "offered", "weight"])
            if (table.Peek(role) is { } column && !seen.TryAdd(column, role))
                problems.Add("study.same_column", table.PlaceOf(role), $"'{role}' names the same column as '{seen[column]}'", "name a column of its own for each", column);
    }
}
