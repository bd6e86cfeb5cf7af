using System.Text;

namespace PanelChoice.Cli;

/// <summary>
/// Text that is safe to show. Names come from other people's files, and a control character among them would move the reader's cursor, change
/// colours, ring, or turn the direction of writing.
/// </summary>
internal static class Printable
{
    private const char Unprintable = '\uFFFD';

    /// <summary>The text in one line: blanks for line breaks and tabs, a replacement character for every other control.</summary>
    public static string Of(string text)
    {
        if (!text.AsSpan().ContainsAnyInRange('\0', '\u001F') && !text.Any(c => c >= '\u007F' && IsControl(c))) return text;
        var safe = new StringBuilder(text.Length);
        foreach (var c in text.ReplaceLineEndings(" ")) safe.Append(c == '\t' ? ' ' : IsControl(c) ? Unprintable : c);
        return safe.ToString();
    }

    private static bool IsControl(char c) => char.IsControl(c) || c is (>= '\u202A' and <= '\u202E') or (>= '\u2066' and <= '\u2069');
}
