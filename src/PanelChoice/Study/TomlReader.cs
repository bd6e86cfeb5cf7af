using Tomlyn;
using Tomlyn.Parsing;
using Tomlyn.Syntax;

namespace PanelChoice.Study;

/// <summary>Turns the text of a study file into a tree of tables and values with their places.</summary>
internal static class TomlReader
{
    /// <summary>Reads the text. Syntax errors and keys or tables defined twice are added to the problems; the tree holds what could be read.</summary>
    /// <param name="text">The text, with or without a byte order mark.</param>
    /// <param name="problems">Where problems go.</param>
    /// <param name="firstError">Line of the first syntax error, from which on the tree is not to be trusted; null when there is none.</param>
    public static TomlTable Read(string text, StudyProblems problems, out int? firstError)
    {
        var root = new TomlTable(new Place(1, 1)) { Origin = TableOrigin.Header };
        DocumentSyntax document;
        try
        {
            document = SyntaxParser.Parse(text, "study", false);
        }
        catch (TomlException e)
        {
            // The parser gives up on brackets nested beyond any use; its own words speak of its own settings.
            firstError = 1;
            var place = new Place(Math.Max(1, e.Line ?? 1), Math.Max(1, e.Column ?? 1));
            problems.Add("study.syntax", place, "lists or tables lie too deep inside each other to be read", "nest lists and tables no deeper than the study file asks for");
            return root;
        }

        firstError = ReportSyntax(document, problems);
        AddAll(document.KeyValues, root, "", problems, true);
        foreach (var table in document.Tables) AddTable(table, root, problems);

        // Whatever the library's own check of definitions finds beyond ours must not pass in silence.
        if (firstError is null && problems.Count == 0)
            firstError = ReportSyntax(SyntaxParser.Parse(text, "study", true), problems);
        return root;
    }

    /// <summary>
    /// One mistake makes the parser stumble over what follows, on the same line and on the next ones. So of a run of errors on
    /// neighbouring lines only the first is reported.
    /// </summary>
    private static int? ReportSyntax(DocumentSyntax document, StudyProblems problems)
    {
        int? first = null;
        var last = int.MinValue;
        foreach (var error in document.Diagnostics.Where(d => d.Kind == DiagnosticMessageKind.Error).OrderBy(d => d.Span.Start.Line).ThenBy(d => d.Span.Start.Column))
        {
            var place = PlaceOf(error);
            first ??= place.Line;
            if (place.Line > last + 1)
                problems.Add(
                    "study.syntax", place, $"this is not TOML: {error.Message.Replace("␤", "the end of the line", StringComparison.Ordinal)}",
                    "write key = value, one to a line, text in quotes, lists in [ ], tables as [name] or [[name]]");
            last = place.Line;
        }

        return first;
    }

    private static void AddTable(TableSyntaxBase syntax, TomlTable root, StudyProblems problems)
    {
        if (syntax.Name is null) return;
        var path = PathOf(syntax.Name);
        var place = PlaceOf(syntax);
        var isList = syntax is TableArraySyntax;
        var shown = isList ? $"[[{string.Join('.', path)}]]" : $"[{string.Join('.', path)}]";
        var table = new TomlTable(place) { Origin = TableOrigin.Header };
        var clean = true;
        if (Descend(root, path, place, TableOrigin.Implied) is not { } parent)
        {
            problems.Add("study.duplicate_table", place, $"{shown} lies under a key that already has another value", "define it once, in one way");
            return;
        }

        switch (parent.Find(path[^1])?.Value)
        {
            case null:
                parent.Add(new TomlEntry(path[^1], place, isList ? new TomlList(place, [table], true) : table));
                break;
            case TomlList { FromHeaders: true } list when isList:
                list.Items.Add(table);
                break;
            case TomlTable { Origin: TableOrigin.Implied } implied when !isList:
                implied.Origin = TableOrigin.Header;
                table = implied;
                break;
            case var earlier:
                clean = false;
                problems.Add(
                    "study.duplicate_table", place, $"{shown} is already defined in line {earlier.Place.Line}",
                    earlier is TomlList != isList ? "write it in one way, as a single table or as a list of tables" : "put all its keys under one header");
                // Its keys are still looked at, so that their own problems come out in the same run.
                if (earlier is TomlTable { Origin: not TableOrigin.Inline } again && !isList) table = again;
                break;
        }

        AddAll(syntax.Items, table, shown, problems, clean);
    }

    private static void AddAll(IEnumerable<KeyValueSyntax> items, TomlTable table, string shown, StudyProblems problems, bool reportTwice)
    {
        foreach (var item in items)
        {
            if (item.Key?.Key is null || item.Value is null) continue;
            var path = PathOf(item.Key);
            var place = PlaceOf(item.Key);
            var parent = Descend(table, path, place, TableOrigin.Dotted);
            if (parent?.Find(path[^1]) is { } earlier)
            {
                if (reportTwice)
                    problems.Add(
                        "study.duplicate_key", place,
                        $"the key '{string.Join('.', path)}'{(shown.Length > 0 ? $" of {shown}" : "")} already stands in line {earlier.Place.Line}", "keep one of the two");
            }
            else if (parent is null)
                problems.Add("study.duplicate_key", place, $"'{string.Join('.', path)}' lies under a key that already has another value", "define it once, in one way");
            else
                parent.Add(new TomlEntry(path[^1], place, ValueOf(item.Value, problems)));
        }
    }

    /// <summary>The table that holds the last part of a path; null when the way is barred by a value or by a table that is closed.</summary>
    private static TomlTable? Descend(TomlTable from, List<string> path, Place place, TableOrigin origin)
    {
        var table = from;
        foreach (var part in path.SkipLast(1))
        {
            switch (table.Find(part)?.Value)
            {
                case null:
                    var made = new TomlTable(place) { Origin = origin };
                    table.Add(new TomlEntry(part, place, made));
                    table = made;
                    break;
                case TomlTable next when next.Origin != TableOrigin.Inline && (origin == TableOrigin.Implied || next.Origin == TableOrigin.Dotted):
                    table = next;
                    break;
                case TomlList { FromHeaders: true } list when origin == TableOrigin.Implied:
                    table = (TomlTable)list.Items[^1];
                    break;
                default:
                    return null;
            }
        }

        return table;
    }

    private static TomlValue ValueOf(ValueSyntax value, StudyProblems problems)
    {
        var place = PlaceOf(value);
        switch (value)
        {
            case StringValueSyntax text: return new TomlText(place, text.Value ?? "");
            case IntegerValueSyntax whole: return new TomlWhole(place, whole.Value);
            case FloatValueSyntax number: return new TomlNumber(place, number.Value);
            case BooleanValueSyntax flag: return new TomlFlag(place, flag.Value);
            case DateTimeValueSyntax { Kind: SyntaxKind.LocalDate } date: return new TomlDate(place, DateOnly.FromDateTime(date.Value.DateTime.Date));
            case ArraySyntax array:
                return new TomlList(place, [.. array.Items.Where(i => i.Value is not null).Select(i => ValueOf(i.Value!, problems))], false);
            case InlineTableSyntax inline:
                var table = new TomlTable(place) { Origin = TableOrigin.Inline };
                AddAll(inline.Items.Where(i => i.KeyValue is not null).Select(i => i.KeyValue!), table, "", problems, true);
                return table;
            default: return new TomlTime(place, value.ToString().Trim());
        }
    }

    private static List<string> PathOf(KeySyntax key)
    {
        List<string> path = [NameOf(key.Key)];
        foreach (var dotted in key.DotKeys) path.Add(NameOf(dotted.Key));
        return path;
    }

    private static string NameOf(BareKeyOrStringValueSyntax? key) => key switch
    {
        BareKeySyntax bare => bare.Key?.Text ?? "",
        StringValueSyntax text => text.Value ?? "",
        _ => "",
    };

    private static Place PlaceOf(SyntaxNodeBase node) => new(node.Span.Start.Line + 1, node.Span.Start.Column + 1);

    private static Place PlaceOf(DiagnosticMessage message) => new(message.Span.Start.Line + 1, message.Span.Start.Column + 1);
}
