using System.Collections.Immutable;

namespace PanelChoice.Design.Store;

/// <summary>Lists and fields that may be missing, in binary form: a list is its length and its items, what may be missing has a byte before it.</summary>
internal static class BinaryFields
{
    /// <summary>Writes a list.</summary>
    public static void WriteAll<T>(this BinaryWriter to, IEnumerable<T> items, Action<T> write)
    {
        var list = items as IReadOnlyCollection<T> ?? [.. items];
        to.Write(list.Count);
        foreach (var item in list) write(item);
    }

    /// <summary>Writes a text or that there is none.</summary>
    public static void WriteText(this BinaryWriter to, string? text)
    {
        to.Write(text is not null);
        if (text is not null) to.Write(text);
    }

    /// <summary>Writes a number or that there is none.</summary>
    public static void WriteNumber(this BinaryWriter to, double? number)
    {
        to.Write(number is not null);
        if (number is { } n) to.Write(n);
    }

    /// <summary>Reads a list.</summary>
    public static ImmutableArray<T> ReadAll<T>(this BinaryReader from, Func<T> read)
    {
        var count = from.ReadInt32();
        if (count < 0) throw new InvalidDataException("A list has fewer items than none.");
        // A damaged length must not ask for more memory than the items that are there will fill.
        var items = ImmutableArray.CreateBuilder<T>(Math.Min(count, 1 << 16));
        for (var i = 0; i < count; i++) items.Add(read());
        return items.DrainToImmutable();
    }

    /// <summary>Reads a text that may be missing.</summary>
    public static string? ReadText(this BinaryReader from) => from.ReadBoolean() ? from.ReadString() : null;

    /// <summary>Reads a number that may be missing.</summary>
    public static double? ReadNumber(this BinaryReader from) => from.ReadBoolean() ? from.ReadDouble() : null;
}
