using System.Collections.Immutable;
using System.Globalization;

namespace PanelChoice.Study;

/// <summary>A place in the study file; line and position are counted from 1.</summary>
internal readonly record struct Place(int Line, int Position);

/// <summary>A value of the study file, with its place and with its type as TOML has it.</summary>
internal abstract record TomlValue(Place Place)
{
    /// <summary>The value as a problem shows it.</summary>
    public abstract string Shown { get; }

    /// <summary>Its type in plain words.</summary>
    public abstract string Kind { get; }
}

internal sealed record TomlText(Place Place, string Value) : TomlValue(Place)
{
    public override string Shown => Value;

    public override string Kind => "text";
}

internal sealed record TomlWhole(Place Place, long Value) : TomlValue(Place)
{
    public override string Shown => Value.ToString(CultureInfo.InvariantCulture);

    public override string Kind => "a whole number";
}

internal sealed record TomlNumber(Place Place, double Value) : TomlValue(Place)
{
    public override string Shown => Value.ToString("R", CultureInfo.InvariantCulture);

    public override string Kind => "a number with a fraction";
}

internal sealed record TomlFlag(Place Place, bool Value) : TomlValue(Place)
{
    public override string Shown => Value ? "true" : "false";

    public override string Kind => "true or false";
}

internal sealed record TomlDate(Place Place, DateOnly Value) : TomlValue(Place)
{
    public override string Shown => Value.ToString("yyyy-MM-dd", CultureInfo.InvariantCulture);

    public override string Kind => "a date";
}

/// <summary>A time, or a date with a time: the study file has no use for either.</summary>
internal sealed record TomlTime(Place Place, string Value) : TomlValue(Place)
{
    public override string Shown => Value;

    public override string Kind => "a time";
}

/// <summary>A list; <paramref name="FromHeaders"/> when it is written as <c>[[name]]</c> tables, which alone may grow.</summary>
internal sealed record TomlList(Place Place, List<TomlValue> Items, bool FromHeaders) : TomlValue(Place)
{
    public override string Shown => $"[{string.Join(", ", Items.Select(i => i.Shown))}]";

    public override string Kind => "a list";
}

/// <summary>How a table came about, which decides what may be added to it later.</summary>
internal enum TableOrigin
{
    /// <summary>Only named on the way to another table.</summary>
    Implied,

    /// <summary>Opened by its own header.</summary>
    Header,

    /// <summary>Named by a dotted key.</summary>
    Dotted,

    /// <summary>Written in braces, and closed with them.</summary>
    Inline,
}

internal sealed record TomlEntry(string Key, Place Place, TomlValue Value);

internal sealed record TomlTable(Place Place) : TomlValue(Place)
{
    private readonly List<TomlEntry> entries = [];

    public TableOrigin Origin { get; set; }

    /// <summary>The entries in the order of the file.</summary>
    public IReadOnlyList<TomlEntry> Entries => entries;

    public override string Shown => "{ ... }";

    public override string Kind => "a table";

    public TomlEntry? Find(string key) => entries.Find(e => e.Key == key);

    public void Add(TomlEntry entry) => entries.Add(entry);

    /// <summary>The tables under a key that is written <c>[[key]]</c> or as a list of inline tables; empty when it is absent or something else.</summary>
    public ImmutableArray<TomlTable> TablesUnder(string key) =>
        Find(key)?.Value is TomlList list ? [.. list.Items.OfType<TomlTable>()] : [];
}
