using System.Diagnostics;
using System.Globalization;
using System.Runtime.InteropServices;
using Microsoft.Win32.SafeHandles;
using PanelChoice.Results.Refits;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>A process of the real program that holds still at a place of its run until it is killed or interrupted.</summary>
internal sealed class HeldRun : IDisposable
{
    private static readonly string Hook = typeof(StartupHook).Assembly.Location;

    private readonly Process process;
    private readonly string mark;

    /// <summary>Starts an estimation in the study's folder.</summary>
    /// <param name="study">The study.</param>
    /// <param name="place">Where it holds; see <see cref="StartupHook.Place"/>.</param>
    /// <param name="args">What follows the study on the command line.</param>
    public HeldRun(SmallStudy study, string place, params string[] args)
    {
        mark = Path.Combine(Path.GetTempPath(), $"panelchoice-{Guid.NewGuid():N}.mark");
        process = CommandLineProcess.Start(
            study.Folder,
            new Dictionary<string, string> { ["DOTNET_STARTUP_HOOKS"] = Hook, ["DOTNET_TieredPGO"] = "0", [StartupHook.Place] = place, [StartupHook.Mark] = mark },
            ["estimate", "study.toml", "--threads", "1", .. args]);
    }

    /// <summary>Waits until something is so; fails where the run ends before.</summary>
    public void Until(Func<bool> isSo)
    {
        while (!isSo())
        {
            if (process.HasExited) throw new InvalidOperationException($"The run ended with {process.ExitCode} before it was held: {process.StandardError.ReadToEnd()}");
            Thread.Sleep(2);
        }
    }

    /// <summary>Waits until it holds.</summary>
    public void UntilHeld() => Until(() => File.Exists(mark));

    /// <summary>Waits until so many refits are in a journal, as another process sees it.</summary>
    public void UntilKept(string journal, int count)
    {
        // Where nobody may look into a file that is locked, the mark has to do.
        if (!OperatingSystem.IsWindows()) Until(() => CountIn(journal) >= count);
        UntilHeld();
    }

    /// <summary>Kills it as the system does: with no chance to do anything more.</summary>
    public void Kill()
    {
        process.Kill();
        process.WaitForExit();
    }

    /// <summary>Interrupts it as Ctrl-C does and waits for its end.</summary>
    public Outcome Interrupt()
    {
        // TERM and INT have the same handler; INT is ignored by children of a shell that runs its jobs in the background.
        using (var kill = Process.Start("kill", ["-TERM", process.Id.ToString(CultureInfo.InvariantCulture)])) kill.WaitForExit();
        var error = process.StandardError.ReadToEndAsync();
        var output = process.StandardOutput.ReadToEnd();
        process.WaitForExit();
        return new Outcome(process.ExitCode, output, error.Result);
    }

    public void Dispose()
    {
        if (!process.HasExited) Kill();
        process.Dispose();
        File.Delete(mark);
    }

    /// <summary>Whole records in a journal that another process may be writing.</summary>
    public static int CountIn(string journal)
    {
        if (!File.Exists(journal)) return 0;
        // The runtime's own way of opening asks for a lock, which the writer does not share; the system's does not ask.
        using var stream = OperatingSystem.IsWindows() ? File.OpenRead(journal) : new FileStream(new SafeFileHandle(Open(journal, 0), ownsHandle: true), FileAccess.Read);
        return RefitFile.Read(journal, stream).Outcomes.Count;
    }

    [DllImport("libc", EntryPoint = "open", CharSet = CharSet.Ansi, BestFitMapping = false, ThrowOnUnmappableChar = true, SetLastError = true)]
    [DefaultDllImportSearchPaths(DllImportSearchPath.SafeDirectories)]
    private static extern int Open(string path, int flags);
}
