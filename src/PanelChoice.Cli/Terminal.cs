namespace PanelChoice.Cli;

/// <summary>Where a command writes: tables to one stream, progress and problems to the other.</summary>
/// <param name="Out">Standard output.</param>
/// <param name="Error">Standard error.</param>
/// <param name="OutIsTerminal">Whether a person sees standard output directly.</param>
/// <param name="ErrorIsTerminal">Whether a person sees standard error directly; without one there is no progress.</param>
/// <param name="AllowsColour">Whether the environment allows colour (NO_COLOR is unset or empty, and the terminal is no dumb one).</param>
internal sealed record Terminal(TextWriter Out, TextWriter Error, bool OutIsTerminal, bool ErrorIsTerminal, bool AllowsColour)
{
    /// <summary>The streams of this process.</summary>
    public static Terminal OfProcess() => new(
        Console.Out, Console.Error, !Console.IsOutputRedirected, !Console.IsErrorRedirected && Environment.GetEnvironmentVariable("TERM") != "dumb",
        Allows(Environment.GetEnvironmentVariable));

    /// <summary>Whether the environment allows colour: NO_COLOR is unset or empty, and the terminal is no dumb one.</summary>
    /// <param name="variable">Reads a variable.</param>
    public static bool Allows(Func<string, string?> variable) => string.IsNullOrEmpty(variable("NO_COLOR")) && variable("TERM") != "dumb";

    /// <summary>Tells a problem in one line on standard error.</summary>
    public void Problem(string sentence) => Tell("panelchoice: " + sentence);

    /// <summary>Writes a line on standard error.</summary>
    public void Tell(string line)
    {
        try
        {
            Error.WriteLine(Printable.Of(line));
        }
        catch (Exception closed) when (closed is IOException or UnauthorizedAccessException)
        {
            // Standard error is the last place to tell anything; where it is closed or full, the exit code has to speak alone.
        }
    }
}
