using System.Globalization;
using PanelChoice.Data;

namespace PanelChoice.Panels;

/// <summary>An occasion as the data file writes it.</summary>
internal static class OccasionName
{
    /// <summary>The whole number, or the date in ISO 8601; empty where there is no occasion column.</summary>
    public static string Of(OccasionKind kind, long occasion) => kind switch
    {
        OccasionKind.WholeNumber => occasion.ToString(CultureInfo.InvariantCulture),
        OccasionKind.Date => DateOnly.FromDayNumber((int)occasion).ToString("yyyy-MM-dd", CultureInfo.InvariantCulture),
        _ => "",
    };
}
