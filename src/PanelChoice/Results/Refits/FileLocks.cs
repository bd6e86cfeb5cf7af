namespace PanelChoice.Results.Refits;

/// <summary>Tells a file that another process has open from one that cannot be opened.</summary>
internal static class FileLocks
{
    // EWOULDBLOCK on Linux and on macOS, ERROR_SHARING_VIOLATION on Windows.
    private static readonly int[] Codes = [11, 35, unchecked((int)0x80070020)];

    /// <summary>Whether a refusal to open a file means that another process is at work on it.</summary>
    /// <param name="refusal">The refusal.</param>
    public static bool IsTaken(IOException refusal) => Codes.Contains(refusal.HResult);

    /// <summary>Opens something, or says that another process has it.</summary>
    /// <param name="busy">How to say it.</param>
    /// <param name="open">Opens it.</param>
    /// <exception cref="IOException">Another process has it, or it cannot be opened.</exception>
    public static T Exclusively<T>(string busy, Func<T> open)
    {
        try
        {
            return open();
        }
        catch (IOException taken) when (IsTaken(taken))
        {
            throw new IOException(busy, taken);
        }
    }
}
