using System.Globalization;
using System.Text;
using System.Text.Json;

namespace PanelChoice.Results;

/// <summary>Short forms for what the documents are made of: objects, lists, figures that may be missing, rows of numbers.</summary>
internal static class JsonWriting
{
    public static void WriteRow(this Utf8JsonWriter json, ReadOnlySpan<double> values)
    {
        // One row on one line keeps a matrix legible, which an indenting writer would not.
        var text = new StringBuilder("[");
        for (var i = 0; i < values.Length; i++)
        {
            if (i > 0) text.Append(", ");
            text.Append(double.IsFinite(values[i]) ? values[i].ToString("R", CultureInfo.InvariantCulture) : "null");
        }

        json.WriteRawValue(text.Append(']').ToString());
    }

    public static void WriteFigure(this Utf8JsonWriter json, string name, double? value)
    {
        if (value is { } number && double.IsFinite(number)) json.WriteNumber(name, number);
        else json.WriteNull(name);
    }

    public static void WriteObject(this Utf8JsonWriter json, string name, Action fields)
    {
        json.WritePropertyName(name);
        json.WriteObject(fields);
    }

    public static void WriteObject(this Utf8JsonWriter json, Action fields)
    {
        json.WriteStartObject();
        fields();
        json.WriteEndObject();
    }

    public static void WriteArray<T>(this Utf8JsonWriter json, string name, IEnumerable<T> items, Action<T> write)
    {
        json.WriteStartArray(name);
        foreach (var item in items) write(item);
        json.WriteEndArray();
    }
}
