using System.Globalization;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>
/// Ways of writing numbers that differ from the invariant one; made by hand, because the program and its tests run without the system's
/// culture data.
/// </summary>
internal static class Cultures
{
    /// <summary>1.234,5 as in much of Europe.</summary>
    public static CultureInfo Comma { get; } = Make(",", ".", "-");

    /// <summary>1'234,5 with a typographic minus.</summary>
    public static CultureInfo Apostrophe { get; } = Make(",", "'", "\u2212");

    private static CultureInfo Make(string point, string group, string minus)
    {
        var culture = (CultureInfo)CultureInfo.InvariantCulture.Clone();
        culture.NumberFormat.NumberDecimalSeparator = culture.NumberFormat.PercentDecimalSeparator = point;
        culture.NumberFormat.NumberGroupSeparator = culture.NumberFormat.PercentGroupSeparator = group;
        culture.NumberFormat.NegativeSign = minus;
        return culture;
    }
}
