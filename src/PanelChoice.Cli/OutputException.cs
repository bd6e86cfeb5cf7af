namespace PanelChoice.Cli;

/// <summary>An output file or folder cannot be written.</summary>
internal sealed class OutputException : Exception
{
    public OutputException(string path, Exception cause)
        : base($"'{path}' cannot be written: {cause.Message}", cause)
    {
    }

    /// <summary>Runs something that writes, and turns the system's refusal into this exception.</summary>
    public static void Guard(string path, Action write)
    {
        try
        {
            write();
        }
        catch (Exception refused) when (refused is IOException or UnauthorizedAccessException or ArgumentException { ParamName: "path" } or NotSupportedException)
        {
            throw new OutputException(path, refused);
        }
    }
}
