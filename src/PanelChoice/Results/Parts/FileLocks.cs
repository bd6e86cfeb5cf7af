namespace PanelChoice.Results.Parts;

/// <summary>Tells a file that another process has open from one that cannot be opened.</summary>
internal static class FileLocks
{
    // EWOULDBLOCK on Linux and on macOS, ERROR_SHARING_VIOLATION on Windows.
    private static readonly int[] Codes = [11, 35, unchecked((int)0x80070020)];

    /// <summary>Whether a refusal to open a file means that another process is at work on it.</summary>
    /// <param name="refusal">The refusal.</param>
    public static bool IsTaken(IOException refusal) => Codes.Contains(refusal.HResult);
}
