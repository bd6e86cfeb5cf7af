using System.Collections.Immutable;
using System.Globalization;

namespace PanelChoice.Study;

/// <summary>
/// Reads the keys of one table with their types and ranges. A value that does not fit is a problem and is read as if it were absent, so
/// that the rest of the file can still be looked at; what is made in spite of problems never leaves the stage.
/// </summary>
/// <param name="table">The table.</param>
/// <param name="name">How a problem calls it, for example <c>[panel]</c>.</param>
/// <param name="problems">Where problems go.</param>
internal sealed class TableReader(TomlTable table, string name, StudyProblems problems)
{
    public string Name => name;

    /// <summary>The place of the table's header.</summary>
    public Place Place => table.Place;

    public bool Has(string key) => table.Find(key) is not null;

    /// <summary>Whether a key says something: <c>false</c> says nothing.</summary>
    public bool States(string key) => table.Find(key)?.Value is not (null or TomlFlag { Value: false });

    /// <summary>The text of a key without any complaint; null when it is not text.</summary>
    public string? Peek(string key) => (table.Find(key)?.Value as TomlText)?.Value;

    /// <summary>The place of a key, or of the table where the key is absent.</summary>
    public Place PlaceOf(string key) => table.Find(key)?.Place ?? table.Place;

    /// <summary>Reports a missing key.</summary>
    public void Missing(string key, string remedy) =>
        problems.Add("study.missing_key", table.Place, $"{name} has no '{key}'", remedy);

    /// <summary>Text that is not empty; null when the key is absent or has a problem.</summary>
    public string? Text(string key)
    {
        switch (table.Find(key)?.Value)
        {
            case null: return null;
            case TomlText text: return NotEmpty(key, text);
            case var other:
                WrongType(key, other, "text", $"write {key} = \"...\"");
                return null;
        }
    }

    /// <summary>Text that must be there.</summary>
    public string? NeededText(string key, string remedy)
    {
        if (!Has(key)) Missing(key, remedy);
        return Text(key);
    }

    /// <summary>One of a few words.</summary>
    public T Word<T>(string key, T otherwise, params (string Word, T Value)[] words)
    {
        if (Text(key) is not { } text) return otherwise;
        foreach (var (word, value) in words)
            if (word == text) return value;
        problems.Add(
            "study.unknown_value", table.Find(key)!.Value.Place, $"'{key}' in {name} cannot be this",
            ClosestName.Of(text, words.Select(w => w.Word)) is { } close
                ? $"did you mean \"{close}\"?"
                : $"use {string.Join(" or ", words.Select(w => $"\"{w.Word}\""))}",
            text);
        return otherwise;
    }

    /// <summary>A whole number from <paramref name="least"/> to <paramref name="most"/>.</summary>
    public int? Whole(string key, int least, int most = int.MaxValue)
    {
        switch (table.Find(key)?.Value)
        {
            case null: return null;
            case TomlWhole whole when whole.Value >= least && whole.Value <= most: return (int)whole.Value;
            case TomlWhole whole:
                OutOfRange(key, whole, string.Create(
                    CultureInfo.InvariantCulture, $"a whole number of {(whole.Value < least ? $"{least} or more" : $"at most {most}")}"));
                return null;
            case var other:
                WrongType(key, other, "a whole number", $"write {key} = {Math.Max(1, least).ToString(CultureInfo.InvariantCulture)} or another whole number, without quotes");
                return null;
        }
    }

    /// <summary>A seed: any whole number of 64 bits.</summary>
    public long Seed(string key, long otherwise)
    {
        switch (table.Find(key)?.Value)
        {
            case null: return otherwise;
            case TomlWhole whole: return whole.Value;
            case var other:
                WrongType(key, other, "a whole number", $"write {key} = 7 or another whole number, without quotes");
                return otherwise;
        }
    }

    /// <summary>A finite number that fits.</summary>
    public double? Number(string key, Func<double, bool> fits, string range)
    {
        switch (table.Find(key)?.Value)
        {
            case null: return null;
            case TomlWhole whole when fits(whole.Value): return whole.Value;
            case TomlNumber number when double.IsFinite(number.Value) && fits(number.Value): return number.Value;
            case TomlWhole or TomlNumber:
                OutOfRange(key, table.Find(key)!.Value, range);
                return null;
            case var other:
                WrongType(key, other, "a number", $"write {key} = a number, without quotes");
                return null;
        }
    }

    /// <summary>A switch; false when absent.</summary>
    public bool Flag(string key) => OptionalFlag(key) ?? false;

    /// <summary>A switch; null when absent.</summary>
    public bool? OptionalFlag(string key)
    {
        switch (table.Find(key)?.Value)
        {
            case null: return null;
            case TomlFlag flag: return flag.Value;
            case var other:
                WrongType(key, other, "true or false", $"write {key} = true or {key} = false, without quotes");
                return null;
        }
    }

    /// <summary>A list of texts, none empty and none twice; empty when absent. A list without entries is a problem.</summary>
    public ImmutableArray<string> Texts(string key)
    {
        var texts = new List<string>();
        foreach (var item in Items(key, "a list of texts", $"write {key} = [\"...\", \"...\"]"))
            if (item is not TomlText text)
                WrongType(key, item, "a list of texts", $"write {key} = [\"...\", \"...\"]");
            else if (NotEmpty(key, text) is { } value)
                AddOnce(key, text, value, texts);
        return [.. texts];
    }

    /// <summary>A list of texts, each with its place; empty when absent.</summary>
    public ImmutableArray<(string Text, Place Place)> PlacedTexts(string key)
    {
        var texts = Texts(key);
        return table.Find(key)?.Value is TomlList list
            ? [.. texts.Select(t => (t, list.Items.OfType<TomlText>().First(i => i.Value == t).Place))]
            : [];
    }

    /// <summary>A list of finite numbers, each with its place; empty when absent.</summary>
    public ImmutableArray<(double Value, Place Place)> Numbers(string key)
    {
        var remedy = $"write {key} = [0.5, 1]";
        var numbers = ImmutableArray.CreateBuilder<(double, Place)>();
        foreach (var item in Items(key, "a list of numbers", remedy))
            switch (item)
            {
                case TomlWhole whole:
                    numbers.Add((whole.Value, item.Place));
                    break;
                case TomlNumber number when double.IsFinite(number.Value):
                    numbers.Add((number.Value, item.Place));
                    break;
                case TomlNumber:
                    OutOfRange(key, item, "a list of finite numbers");
                    break;
                default:
                    WrongType(key, item, "a list of numbers", remedy);
                    break;
            }

        return numbers.ToImmutable();
    }

    /// <summary>A list of dates, as ISO 8601 text or as TOML dates; empty when absent.</summary>
    public ImmutableArray<DateOnly> Dates(string key)
    {
        const string Remedy = "write dates as \"2031-04-14\"";
        var dates = new List<DateOnly>();
        foreach (var item in Items(key, "a list of dates", Remedy))
            if (item is TomlDate date)
                AddOnce(key, item, date.Value, dates);
            else if (item is not TomlText text)
                WrongType(key, item, "a list of dates", Remedy);
            else if (DateOnly.TryParseExact(text.Value, "yyyy-MM-dd", CultureInfo.InvariantCulture, DateTimeStyles.None, out var parsed))
                AddOnce(key, item, parsed, dates);
            else
                problems.Add("study.unknown_value", item.Place, $"an entry of '{key}' in {name} is not a date", Remedy, text.Value);
        return [.. dates];
    }

    private List<TomlValue> Items(string key, string expected, string remedy)
    {
        switch (table.Find(key)?.Value)
        {
            case null: return [];
            case TomlList { Items.Count: > 0 } list: return list.Items;
            case TomlList list:
                problems.Add("study.empty", list.Place, $"'{key}' in {name} is an empty list", $"{remedy} or remove the key");
                return [];
            case var other:
                WrongType(key, other, expected, remedy);
                return [];
        }
    }

    private void AddOnce<T>(string key, TomlValue item, T value, List<T> into)
    {
        if (!into.Contains(value)) into.Add(value);
        else problems.Add("study.listed_twice", item.Place, $"'{key}' in {name} lists this twice", "remove one of the two", item.Shown);
    }

    private string? NotEmpty(string key, TomlText text)
    {
        if (!string.IsNullOrWhiteSpace(text.Value)) return text.Value;
        problems.Add("study.empty", text.Place, $"'{key}' in {name} is empty", "fill it in or remove the key");
        return null;
    }

    private void WrongType(string key, TomlValue value, string expected, string remedy) =>
        problems.Add("study.wrong_type", value.Place, $"'{key}' in {name} must be {expected}, not {value.Kind}", remedy, value.Shown);

    private void OutOfRange(string key, TomlValue value, string range) =>
        problems.Add("study.out_of_range", value.Place, $"'{key}' in {name} must be {range}", "change the value", value.Shown);
}
