using System.Globalization;
using System.Text.RegularExpressions;
using Spectre.Console;
using Spectre.Console.Rendering;

namespace PanelChoice.Cli.Report;

/// <summary>A column of a table: its heading, and whether it holds numbers (set to the right, never broken) or words.</summary>
/// <param name="Heading">Heading; may be broken over lines.</param>
/// <param name="IsNumber">Whether it holds numbers.</param>
internal sealed record TableColumnPlan(string Heading, bool IsNumber = true);

/// <summary>
/// A report that reads from top to bottom like a letter: headings, paragraphs and plain tables, 80 columns wide. It is put together first
/// and rendered once, in bold headings for a terminal or as plain text.
/// </summary>
internal sealed partial class Letter
{
    /// <summary>Nothing is wider.</summary>
    public const int Width = 80;
    private const int Indent = 2;

    private static readonly Style Bold = new(decoration: Decoration.Bold);

    private readonly List<IRenderable> parts = [];

    /// <summary>The title of the whole.</summary>
    public Letter Title(string text)
    {
        if (parts.Count > 0) Gap();
        parts.Add(new Text(Printable.Of(text), Bold));
        return this;
    }

    /// <summary>Opens a section.</summary>
    public Letter Heading(string text)
    {
        Gap();
        parts.Add(new Text(Printable.Of(text), Bold));
        return this;
    }

    /// <summary>A line right below a title.</summary>
    public Letter Subtitle(string text)
    {
        parts.Add(new Text(Printable.Of(text)));
        return this;
    }

    /// <summary>A paragraph, set in a little.</summary>
    public Letter Paragraph(string text, bool emphasised = false)
    {
        parts.Add(new Padder(new Text(Printable.Of(text), emphasised ? Bold : Style.Plain), new Padding(Indent, 0, 0, 0)));
        return this;
    }

    /// <summary>Paragraphs with an empty line between them.</summary>
    public Letter Paragraphs(IEnumerable<(string Text, bool Emphasised)> paragraphs)
    {
        var first = true;
        foreach (var (text, emphasised) in paragraphs)
        {
            if (!first) Gap();
            Paragraph(text, emphasised);
            first = false;
        }

        return this;
    }

    /// <summary>An empty line.</summary>
    public Letter Gap()
    {
        parts.Add(new Text(" "));
        return this;
    }

    /// <summary>A table without lines; the first columns of words give way when it would be too wide.</summary>
    /// <param name="columns">Its columns.</param>
    /// <param name="rows">Its rows, a cell for each column.</param>
    public Letter Table(IReadOnlyList<TableColumnPlan> columns, IEnumerable<IReadOnlyList<string>> rows)
    {
        var table = new Table { Border = TableBorder.None, ShowHeaders = columns.Any(c => c.Heading.Length > 0) };
        for (var i = 0; i < columns.Count; i++)
        {
            var column = new TableColumn(new Text(Printable.Of(columns[i].Heading))) { Padding = new Padding(0, 0, i + 1 < columns.Count ? 2 : 0, 0) };
            if (columns[i].IsNumber) column.RightAligned().NoWrap();
            table.AddColumn(column);
        }

        foreach (var row in rows) table.AddRow(row.Select(cell => new Text(Printable.Of(cell))));
        parts.Add(new Padder(table, new Padding(Indent, 0, 0, 0)));
        return this;
    }

    /// <summary>Adds all of another letter below an empty line.</summary>
    public Letter Append(Letter other)
    {
        ArgumentNullException.ThrowIfNull(other);
        if (parts.Count > 0) Gap();
        parts.AddRange(other.parts);
        return this;
    }

    /// <summary>The report as text; plain unless styled.</summary>
    /// <param name="styled">Whether headings may be in bold.</param>
    public string Render(bool styled)
    {
        using var text = new StringWriter(CultureInfo.InvariantCulture) { NewLine = "\n" };
        var console = AnsiConsole.Create(new AnsiConsoleSettings
        {
            Ansi = styled ? AnsiSupport.Yes : AnsiSupport.No,
            ColorSystem = styled ? ColorSystemSupport.Standard : ColorSystemSupport.NoColors,
            Interactive = InteractionSupport.No,
            Out = new AnsiConsoleOutput(text),
        });
        console.Profile.Width = Width;
        console.Profile.Capabilities.Unicode = true;
        foreach (var part in parts)
        {
            console.Write(part);
            if (part is Text) console.WriteLine();
        }

        return TrailingBlanks().Replace(text.ToString().ReplaceLineEndings("\n"), "");
    }

    [GeneratedRegex("[ \t]+(?=\n)")]
    private static partial Regex TrailingBlanks();
}
