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
    public void Print(Letter letter) => Print(letter.Render(Terminal.OutIsTerminal && Terminal.AllowsColour && !NoColour));

    /// <summary>Prints text that is ready to be shown, unless the user asked for quiet.</summary>
    public void Print(string text)
    {
        if (!Quiet) OutputException.Guard("standard output", () => Terminal.Out.Write(text));
    }
}
