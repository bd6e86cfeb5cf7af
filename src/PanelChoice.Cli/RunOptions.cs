using PanelChoice.Cli.Report;

namespace PanelChoice.Cli;

/// <summary>What every command takes.</summary>
/// <param name="Threads">Threads, 1 or more.</param>
/// <param name="Quiet">No table and no progress; problems are still told.</param>
/// <param name="NoColour">Whether the user asked for plain text.</param>
/// <param name="Terminal">Where to write.</param>
/// <param name="Cancellation">Set by the user's interrupt.</param>
internal sealed record RunOptions(int Threads, bool Quiet, bool NoColour, Terminal Terminal, CancellationToken Cancellation)
{
    /// <summary>Prints a report, unless the user asked for quiet.</summary>
    public void Print(Letter letter)
    {
        if (!Quiet) Terminal.Out.Write(letter.Render(Terminal.OutIsTerminal && Terminal.AllowsColour && !NoColour));
    }
}
