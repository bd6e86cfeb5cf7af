using System.Diagnostics.Tracing;

namespace PanelChoice.Results;

/// <summary>
/// What a run has made durable, for tracing tools: under the name <c>PanelChoice</c> every step after which a run that is ended would be taken up at another
/// place. Costs nothing while nobody listens.
/// </summary>
[EventSource(Name = "PanelChoice")]
internal sealed class RunEvents : EventSource
{
    private RunEvents()
    {
    }

    /// <summary>The source.</summary>
    public static RunEvents Log { get; } = new();

    /// <summary>Refits were handed to the system.</summary>
    /// <param name="file">The file that keeps them.</param>
    /// <param name="count">Refits in it.</param>
    [Event(1)]
    public void RefitsKept(string file, int count)
    {
        if (IsEnabled()) WriteEvent(1, file, count);
    }

    /// <summary>An output file is complete under its temporary name and on the disk.</summary>
    /// <param name="file">The name it will have.</param>
    [Event(2)]
    public void FileWritten(string file)
    {
        if (IsEnabled()) WriteEvent(2, file);
    }

    /// <summary>An output file has its name.</summary>
    /// <param name="file">The name.</param>
    [Event(3)]
    public void FileNamed(string file)
    {
        if (IsEnabled()) WriteEvent(3, file);
    }
}
