namespace PanelChoice.Cli;

/// <summary>Exit codes; the numbers from 64 on are those of the BSD <c>sysexits</c> where one fits.</summary>
internal static class ExitCode
{
    /// <summary>Done.</summary>
    public const int Done = 0;

    /// <summary>Done, but the estimate is not to be trusted; the result says why.</summary>
    public const int NotTrusted = 2;

    /// <summary>With <c>--strict</c>: independence is flagged.</summary>
    public const int Flagged = 3;

    /// <summary>The command line makes no sense.</summary>
    public const int Usage = 64;

    /// <summary>The study or its data are rejected.</summary>
    public const int Rejected = 65;

    /// <summary>The study or its data file is not there.</summary>
    public const int NotFound = 66;

    /// <summary>A fault of the program.</summary>
    public const int Internal = 70;

    /// <summary>The output cannot be written.</summary>
    public const int CannotWrite = 73;

    /// <summary>Interrupted by the user.</summary>
    public const int Interrupted = 130;
}
