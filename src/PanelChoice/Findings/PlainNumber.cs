using System.Globalization;

namespace PanelChoice.Findings;

/// <summary>Numbers as people read them: rounded to their standard error, always with a decimal point, whatever the culture.</summary>
public static class PlainNumber
{
    // Three digits of the standard error: a fourth is noise even with a thousand clusters, whose standard error has an error of 2 percent.
    private const int DigitsOfError = 3;
    private const int MostDecimals = 6;
    private const int MostWholeDigits = 9;

    /// <summary>How many decimals a value with this standard error deserves; without a usable one, enough for four digits of the value.</summary>
    /// <param name="value">The value.</param>
    /// <param name="standardError">Its standard error; null when there is none.</param>
    public static int Decimals(double value, double? standardError)
    {
        var (size, digits) = standardError is { } se && double.IsFinite(se) && se > 0 ? (se, DigitsOfError) : (Math.Abs(value), DigitsOfError + 1);
        if (!double.IsFinite(size) || size == 0) return DigitsOfError;
        return Math.Max(0, digits - 1 - (int)Math.Floor(Math.Log10(size)));
    }

    /// <summary>A value with the given number of decimals; very small or large ones in powers of ten; "none" where it is not finite.</summary>
    /// <param name="value">The value.</param>
    /// <param name="decimals">Decimals, as <see cref="Decimals"/> gives them.</param>
    public static string Text(double value, int decimals)
    {
        if (!double.IsFinite(value)) return "none";
        if (decimals > MostDecimals || Math.Abs(value) >= Math.Pow(10, MostWholeDigits)) return value.ToString("0.00e+0", CultureInfo.InvariantCulture);
        return WithoutNegativeZero(value.ToString("F" + decimals.ToString(CultureInfo.InvariantCulture), CultureInfo.InvariantCulture));
    }

    /// <summary>A value rounded to its standard error.</summary>
    /// <param name="value">The value.</param>
    /// <param name="standardError">Its standard error; null when there is none.</param>
    public static string Rounded(double value, double? standardError) => Text(value, Decimals(value, standardError));

    /// <summary>A p-value: three digits, or "below 0.0001".</summary>
    /// <param name="p">The p-value.</param>
    public static string PValue(double p) => p switch
    {
        < 0.0001 => "below 0.0001",
        < 0.001 => p.ToString("F4", CultureInfo.InvariantCulture),
        _ => p.ToString("F3", CultureInfo.InvariantCulture),
    };

    /// <summary>A p-value inside a sentence: "p = 0.012", "p below 0.0001".</summary>
    /// <param name="p">The p-value.</param>
    public static string PValueInWords(double p) => p < 0.0001 ? "p below 0.0001" : "p = " + PValue(p);

    /// <summary>A whole number with thousands set apart by commas.</summary>
    /// <param name="count">The number.</param>
    public static string Count(double count) => Math.Round(count).ToString("#,0", CultureInfo.InvariantCulture);

    /// <summary>A ratio or a z with two decimals.</summary>
    /// <param name="ratio">The ratio.</param>
    public static string Ratio(double ratio) => WithoutNegativeZero(ratio.ToString("F2", CultureInfo.InvariantCulture));

    /// <summary>A share as a percentage with one decimal.</summary>
    /// <param name="share">The share, 0 to 1.</param>
    public static string Percent(double share) => (100 * share).ToString("0.0", CultureInfo.InvariantCulture) + "%";

    /// <summary>A share in words: "95 percent", with as many decimals as it needs, three at most.</summary>
    /// <param name="share">The share, 0 to 1.</param>
    public static string PercentInWords(double share) => (100 * share).ToString("0.###", CultureInfo.InvariantCulture) + " percent";

    /// <summary>A count with its noun: "1 person", "1,250 persons".</summary>
    /// <param name="count">The count.</param>
    /// <param name="noun">The noun for one.</param>
    public static string Counted(long count, string noun) => Count(count) + " " + noun + (count == 1 ? "" : "s");

    private static string WithoutNegativeZero(string text) =>
        text.StartsWith('-') && text.AsSpan(1).IndexOfAnyExcept('0', '.') < 0 ? text[1..] : text;
}
