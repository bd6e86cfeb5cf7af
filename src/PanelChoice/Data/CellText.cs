using System.Globalization;

namespace PanelChoice.Data;

/// <summary>How cells of text are read: always with a decimal point, never by the culture of the machine.</summary>
internal static class CellText
{
    private const NumberStyles Plain = NumberStyles.AllowLeadingSign | NumberStyles.AllowDecimalPoint | NumberStyles.AllowExponent;

    /// <summary>Reads a number; NaN and infinities are numbers here, and the caller's business.</summary>
    public static bool TryNumber(ReadOnlySpan<byte> utf8, out double value) => double.TryParse(utf8, Plain, CultureInfo.InvariantCulture, out value);

    /// <summary>Reads a whole number written without point or exponent.</summary>
    public static bool TryWhole(ReadOnlySpan<byte> utf8, out long value) =>
        long.TryParse(utf8, NumberStyles.AllowLeadingSign, CultureInfo.InvariantCulture, out value);

    /// <summary>Reads true or false in any case.</summary>
    public static bool TryTruth(ReadOnlySpan<byte> utf8, out bool value)
    {
        value = System.Text.Ascii.EqualsIgnoreCase(utf8, "true"u8);
        return value || System.Text.Ascii.EqualsIgnoreCase(utf8, "false"u8);
    }

    /// <summary>Reads a date in the extended form of ISO 8601, 2031-04-14.</summary>
    public static bool TryDate(ReadOnlySpan<byte> utf8, out DateOnly value)
    {
        value = default;
        if (utf8.Length != 10 || utf8[4] != '-' || utf8[7] != '-') return false;
        if (!TryDigits(utf8[..4], out var year) || !TryDigits(utf8[5..7], out var month) || !TryDigits(utf8[8..], out var day)) return false;
        if (year < 1 || month is < 1 or > 12 || day < 1 || day > DateTime.DaysInMonth(year, month)) return false;
        value = new DateOnly(year, month, day);
        return true;
    }

    /// <summary>The whole number that a number is, if it is one that a double holds exactly.</summary>
    public static bool IsWhole(double value, out long whole)
    {
        const double exact = 9007199254740992; // 2^53
        whole = 0;
        if (!(Math.Abs(value) <= exact) || value != Math.Floor(value)) return false;
        whole = (long)value;
        return true;
    }

    /// <summary>Whether a text is a number but for a decimal comma, perhaps with points between thousands.</summary>
    public static bool HasDecimalComma(ReadOnlySpan<byte> utf8)
    {
        var comma = utf8.IndexOf((byte)',');
        if (comma < 0) return false;
        Span<byte> mended = stackalloc byte[64];
        if (utf8.Length > mended.Length) return false;
        var length = 0;
        for (var i = 0; i < utf8.Length; i++)
        {
            if (utf8[i] == '.' && i < comma) continue;
            mended[length++] = i == comma ? (byte)'.' : utf8[i];
        }

        return TryNumber(mended[..length], out var value) && double.IsFinite(value);
    }

    /// <summary>A number as people write it: whole numbers without a point, others with the fewest digits that read back the same.</summary>
    public static string Of(double value) =>
        IsWhole(value, out var whole) ? whole.ToString(CultureInfo.InvariantCulture) : value.ToString(CultureInfo.InvariantCulture);

    private static bool TryDigits(ReadOnlySpan<byte> utf8, out int value) => int.TryParse(utf8, NumberStyles.None, CultureInfo.InvariantCulture, out value);
}
