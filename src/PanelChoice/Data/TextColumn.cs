using System.Collections.Immutable;
using System.Globalization;
using System.Runtime.InteropServices;
using System.Text;
using System.Text.Unicode;

namespace PanelChoice.Data;

/// <summary>
/// A column of names, held as codes: ids of persons and alternatives, text attributes, clusters. A number is named as people write it, so
/// that 3 in one file and 3.0 in a file of floating-point numbers are the same person.
/// </summary>
/// <param name="file">The data file as the study writes it.</param>
/// <param name="name">Name of the column.</param>
/// <param name="isKey">Whether every row needs a value; otherwise a cell may be empty where the alternative was not offered.</param>
/// <param name="known">Values whose codes are given, code by code, when the column is read again; none at the first reading.</param>
internal sealed class TextColumn(string file, string name, bool isKey, ImmutableArray<string> known) : ValueColumn<int>(file, name)
{
    /// <summary>A longer value is no name; it is free text, or a quote that closed far too late.</summary>
    private const int Longest = 200;

    private readonly Dictionary<string, int> codeOf = Numbered(known);
    private byte[] lastText = [];
    private int lastLength = -1;
    private int lastCode;

    /// <summary>Codes of the entries, in the order in which their values first came up.</summary>
    public ReadOnlySpan<int> Codes => Values.Span;

    /// <summary>The names that came up, code by code.</summary>
    public ImmutableArray<string> Names()
    {
        var names = new string[codeOf.Count];
        foreach (var (value, code) in codeOf) names[code] = value;
        return ImmutableCollectionsMarshal.AsImmutableArray(names);
    }

    /// <summary>Whether a value came up that is not among the known ones.</summary>
    public bool HasUnknown => codeOf.Count > known.Length;

    /// <summary>Hands the column over with its values in ordinal order; it can take no more cells.</summary>
    public CodedColumn Finish()
    {
        var levels = codeOf.Keys.ToArray();
        Array.Sort(levels, StringComparer.Ordinal);
        var rank = new int[levels.Length];
        for (var i = 0; i < levels.Length; i++) rank[codeOf[levels[i]]] = i;
        for (var i = 0; i < Values.Count; i++) if (Values[i] >= 0) Values[i] = rank[Values[i]];
        return new CodedColumn(Values.Take(Values.Count), ImmutableCollectionsMarshal.AsImmutableArray(levels));
    }

    public override void Whole(CellPlace at, long value)
    {
        Span<char> text = stackalloc char[20];
        value.TryFormat(text, out var length, provider: CultureInfo.InvariantCulture);
        Values.Add(CodeOf(text[..length]));
    }

    public override void Number(CellPlace at, double value)
    {
        if (double.IsNaN(value)) Empty(at);
        else if (CellText.IsWhole(value, out var whole)) Whole(at, whole);
        else Values.Add(CodeOf(CellText.Of(value)));
    }

    public override void Truth(CellPlace at, bool value) => Values.Add(CodeOf(value ? "true" : "false"));

    public override void Moment(CellPlace at, DateTime value) => Values.Add(CodeOf(Shown(value)));

    public override void Empty(CellPlace at)
    {
        if (isKey) RejectEmpty(at, "every row needs a value here");
        else if (at.IsOffered) RejectEmpty(at, "give the value; a cell may be empty only where the alternative was not offered");
        Values.Add(CodedColumn.NoValue);
    }

    protected override void Written(CellPlace at, ReadOnlySpan<byte> utf8)
    {
        // Long panels repeat a person's id row after row: comparing with the cell above is much cheaper than a look-up.
        if (lastLength == utf8.Length && utf8.SequenceEqual(lastText.AsSpan(0, lastLength)))
        {
            Values.Add(lastCode);
            return;
        }

        var code = CodedColumn.NoValue;
        if (!Utf8.IsValid(utf8))
        {
            Reject("data.not_utf8", at, Shown(utf8), "holds bytes that are not UTF-8 text", "save the file as UTF-8");
        }
        else if (Encoding.UTF8.GetCharCount(utf8) > Longest)
        {
            Reject(
                "data.too_long", at, Shown(utf8), "is longer than a name can be, 200 characters",
                "name another column, shorten the values, or look for a quote that is closed too late");
        }
        else
        {
            Span<char> small = stackalloc char[128];
            var text = utf8.Length <= small.Length ? small : new char[utf8.Length];
            code = CodeOf(text[..Encoding.UTF8.GetChars(utf8, text)]);
            if (lastText.Length < utf8.Length) lastText = new byte[Math.Max(64, utf8.Length)];
            utf8.CopyTo(lastText);
            lastLength = utf8.Length;
            lastCode = code;
        }

        Values.Add(code);
    }

    private static Dictionary<string, int> Numbered(ImmutableArray<string> values)
    {
        var codes = new Dictionary<string, int>(values.Length, StringComparer.Ordinal);
        for (var code = 0; code < values.Length; code++) codes.Add(values[code], code);
        return codes;
    }

    private int CodeOf(ReadOnlySpan<char> text)
    {
        var lookup = codeOf.GetAlternateLookup<ReadOnlySpan<char>>();
        if (!lookup.TryGetValue(text, out var code)) codeOf.Add(new string(text), code = codeOf.Count);
        return code;
    }
}
