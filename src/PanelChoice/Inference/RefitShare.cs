using System.Globalization;

namespace PanelChoice.Inference;

/// <summary>One of several shares of the same work, divided by index into stretches of nearly equal length.</summary>
/// <param name="Part">Which, from 1.</param>
/// <param name="Parts">Of how many.</param>
public sealed record RefitShare(int Part, int Parts)
{
    /// <summary>Largest number of parts.</summary>
    public const int MostParts = 9999;

    /// <summary>A share as people write it, "3/16"; null where the text is none.</summary>
    /// <param name="text">The text.</param>
    public static RefitShare? Parse(string text)
    {
        ArgumentNullException.ThrowIfNull(text);
        return text.Split('/') is [var first, var second] && Whole(first, out var part) && Whole(second, out var parts)
            && part >= 1 && part <= parts && parts <= MostParts ? new RefitShare(part, parts) : null;

        static bool Whole(string digits, out int number) => int.TryParse(digits, NumberStyles.None, CultureInfo.InvariantCulture, out number);
    }

    /// <summary>First index of the share in a series of so many.</summary>
    /// <param name="count">Length of the series.</param>
    public int First(int count) => (int)((long)count * (Part - 1) / Parts);

    /// <summary>Number of indices in the share; 0 where there are more parts than indices and this one goes without.</summary>
    /// <param name="count">Length of the series.</param>
    public int Count(int count) => (int)((long)count * Part / Parts) - First(count);
}
