using System.Collections.Frozen;
using System.Collections.Immutable;
using System.Security.Cryptography;
using System.Text;

namespace PanelChoice.Study;

/// <summary>Reads a study file: UTF-8, TOML 1.0.</summary>
public static class StudyFileReader
{
    // Problems of a single key or value; they hold whatever a syntax error further down has done to the rest of the file.
    private static readonly FrozenSet<string> Local = FrozenSet.Create(
        "study.unknown_key", "study.unknown_table", "study.wrong_type", "study.out_of_range", "study.unknown_value", "study.empty",
        "study.listed_twice", "study.not_supported", "study.duplicate_key", "study.duplicate_table");

    /// <summary>
    /// Reads and checks a study file; nothing is known about the data yet. All problems are reported together, in the order of the file,
    /// each with its line and its position in that line. After a syntax error only what stands before it is checked further.
    /// </summary>
    /// <param name="path">Path of the study file; problems call it so.</param>
    /// <returns>The study, or its problems; a file that is not there is one problem, <c>study.not_found</c>.</returns>
    /// <exception cref="ArgumentException">The path is empty.</exception>
    public static Checked<StudySpecification> Read(string path)
    {
        ArgumentException.ThrowIfNullOrWhiteSpace(path);
        if (!File.Exists(path))
        {
            var what = Directory.Exists(path) ? "this is a folder, not a study file" : "there is no such study file";
            return Checked<StudySpecification>.Bad([new Problem("study.not_found", path, what, "check the path")]);
        }

        byte[] bytes;
        try
        {
            bytes = File.ReadAllBytes(path);
        }
        catch (FileNotFoundException)
        {
            return Checked<StudySpecification>.Bad([new Problem("study.not_found", path, "this is a link to a file that is not there", "check the path")]);
        }
        catch (Exception e) when (e is IOException or UnauthorizedAccessException)
        {
            return Checked<StudySpecification>.Bad(
                [new Problem("study.unreadable", path, $"the study file cannot be read ({e.Message})", "check that it may be read and that no other program holds it")]);
        }

        return Decode(bytes, path, out var text) is { } problem ? Checked<StudySpecification>.Bad([problem]) : Parse(path, text, bytes);
    }

    private static Problem? Decode(byte[] bytes, string path, out string text)
    {
        var start = bytes.AsSpan().StartsWith(Encoding.UTF8.Preamble) ? Encoding.UTF8.Preamble.Length : 0;
        try
        {
            text = new UTF8Encoding(false, true).GetString(bytes, start, bytes.Length - start);
            return null;
        }
        catch (DecoderFallbackException e)
        {
            text = "";
            var before = bytes.AsSpan(0, Math.Clamp(start + e.Index, 0, bytes.Length));
            return new Problem("study.not_utf8", path, "the study file is not UTF-8 text", "save it with the encoding UTF-8") { Line = before.Count((byte)'\n') + 1, Position = 1 };
        }
    }

    private static Checked<StudySpecification> Parse(string path, string text, byte[] bytes)
    {
        var problems = new StudyProblems(path);
        var root = TomlReader.Read(text, problems, out var firstError);

        var panelTable = Table(root, "panel", "[panel]", [], problems, true);
        var historyTable = Table(root, "history", "[history]", [], problems);
        var estimateTable = Table(root, "estimate", "[estimate]", [], problems);
        var inferenceTable = Table(root, "inference", "[inference]", ["bootstrap"], problems);
        var bootstrapTable = Table(root.Find("inference")?.Value as TomlTable, "bootstrap", "[inference.bootstrap]", [], problems);
        var diagnosticsTable = Table(root, "diagnostics", "[diagnostics]", [], problems);
        StudyKeys.Check(root, StudyKeys.Head, ["panel", "history", "nest", "term", "test", "estimate", "inference", "diagnostics"], problems);

        var title = new TableReader(root, "the head of the file", problems).Text("title");
        var panel = PanelSection.Read(panelTable, path, problems);
        var history = SettingsSections.History(historyTable, problems);
        var nests = Tables(root, "nest", problems).Select(t => (Nest: NestSection.Read(t, problems), Table: t)).ToList();
        NestSection.Check(nests, problems);
        var terms = Tables(root, "term", problems).Select(t => (Term: TermSection.Read(t, nests.Count > 0, problems), Table: t)).ToList();
        if (terms.Count == 0 && root.Find("term") is null)
            problems.Add("study.missing_table", new Place(1, 1), "the study has no [[term]]", "write a [[term]] for each part of utility");
        ImmutableArray<NestSpecification> nestList = [.. nests.Select(n => n.Nest)];
        StudyRules.Check(terms, nestList, root.Find("panel")?.Value is TomlTable ? panelTable : null, historyTable, history, problems);

        var inference = SettingsSections.Inference(inferenceTable, bootstrapTable, problems);
        StudyRules.CheckSecondCluster(inference, panel, inferenceTable, problems);
        var tests = TestSection.Read(Tables(root, "test", problems), [.. terms.Select(t => t.Term)], nestList, problems);
        var study = new StudySpecification(
            title ?? "", path, text, Convert.ToHexStringLower(SHA256.HashData(bytes)), panel, history, nestList, [.. terms.Select(t => t.Term)],
            SettingsSections.Estimate(estimateTable), inference, SettingsSections.Diagnostics(diagnosticsTable))
        {
            Tests = tests,
        };
        if (problems.Count == 0) return Checked<StudySpecification>.Good(study);
        var all = problems.InFileOrder();
        return Checked<StudySpecification>.Bad(
            firstError is { } line ? [.. all.Where(p => p.Id == "study.syntax" || (p.Line < line && Local.Contains(p.Id)))] : all);
    }

    /// <summary>A single table with its keys checked; an empty one where it is absent or is something else.</summary>
    private static TableReader Table(TomlTable? parent, string key, string name, string[] inner, StudyProblems problems, bool needed = false)
    {
        var entry = parent?.Find(key);
        if (entry is null && needed)
            problems.Add("study.missing_table", new Place(1, 1), $"the study has no {name}", "say there where the data are and which column is which");
        if (entry is not null and not { Value: TomlTable })
            problems.Add("study.wrong_type", entry.Place, $"'{key}' must be a single table, not {entry.Value.Kind}", $"write {name} once and its keys below it");
        var table = entry?.Value as TomlTable ?? new TomlTable(entry?.Place ?? new Place(1, 1));
        StudyKeys.Check(table, name, inner, problems);
        return new TableReader(table, name, needed && entry?.Value is not TomlTable ? new StudyProblems("") : problems);
    }

    /// <summary>The tables of a list of tables, each with its keys checked.</summary>
    private static List<TableReader> Tables(TomlTable root, string key, StudyProblems problems)
    {
        var name = $"[[{key}]]";
        if (root.Find(key) is { } entry && (entry.Value is not TomlList list || list.Items.Any(i => i is not TomlTable)))
            problems.Add("study.wrong_type", entry.Place, $"'{key}' must be a list of tables, not {entry.Value.Kind}", $"write {name} above the keys of each {key}");
        var readers = new List<TableReader>();
        foreach (var table in root.TablesUnder(key))
        {
            StudyKeys.Check(table, name, [], problems);
            readers.Add(new TableReader(table, name, problems));
        }

        return readers;
    }
}
