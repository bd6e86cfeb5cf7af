using System.Diagnostics;
using PanelChoice.Cli;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>What a command line came to.</summary>
/// <param name="Code">Exit code.</param>
/// <param name="Out">Standard output.</param>
/// <param name="Error">Standard error.</param>
internal sealed record Outcome(int Code, string Out, string Error);

/// <summary>Runs the command line: as a process of its own where that matters, inside this one where it would only be slow.</summary>
internal static class CommandLineProcess
{
    private static readonly string Dll = Path.Combine(AppContext.BaseDirectory, "PanelChoice.Cli.dll");

    /// <summary>Runs the built program with both streams piped.</summary>
    public static Outcome Run(string folder, params string[] args) => Run(folder, new Dictionary<string, string>(), args);

    /// <summary>Runs the built program with both streams piped and some variables set.</summary>
    public static Outcome Run(string folder, IReadOnlyDictionary<string, string> variables, params string[] args) => Ended(Start(folder, variables, args));

    /// <summary>Runs the built program where no file may grow beyond a number of bytes.</summary>
    public static Outcome RunLimited(string folder, long fileBytes, params string[] args)
    {
        // The signal that comes with the refusal is ignored, so that the program sees the refusal alone, as on a full disk. The runtime's own scratch
        // files, of which it makes executable memory, are switched off: they would be refused too.
        var start = new ProcessStartInfo("/bin/sh", ["-c", $"trap '' XFSZ; exec prlimit --fsize={fileBytes} dotnet \"$@\"", "sh", Dll, .. args])
        {
            WorkingDirectory = folder, RedirectStandardOutput = true, RedirectStandardError = true, RedirectStandardInput = true, UseShellExecute = false,
        };
        start.Environment["DOTNET_EnableWriteXorExecute"] = "0";
        return Ended(Process.Start(start)!);
    }

    private static Outcome Ended(Process started)
    {
        using var process = started;
        var error = process.StandardError.ReadToEndAsync();
        var output = process.StandardOutput.ReadToEnd();
        process.WaitForExit();
        return new Outcome(process.ExitCode, output, error.Result);
    }

    /// <summary>Starts the built program with both streams piped.</summary>
    public static Process Start(string folder, IReadOnlyDictionary<string, string> variables, params string[] args)
    {
        var start = new ProcessStartInfo("dotnet", [Dll, .. args])
        {
            WorkingDirectory = folder, RedirectStandardOutput = true, RedirectStandardError = true, RedirectStandardInput = true, UseShellExecute = false,
        };
        foreach (var (name, value) in variables) start.Environment[name] = value;
        return Process.Start(start)!;
    }

    /// <summary>Runs the same code inside this process, as if both streams were piped.</summary>
    public static Outcome InProcess(params string[] args) => InProcess(terminal: false, CancellationToken.None, args);

    /// <summary>Runs the same code inside this process.</summary>
    public static Outcome InProcess(bool terminal, CancellationToken cancellation, params string[] args)
    {
        using var output = new StringWriter { NewLine = "\n" };
        using var error = new StringWriter { NewLine = "\n" };
        var code = CommandLine.Run(args, new Terminal(output, error, terminal, false, AllowsColour: terminal), cancellation);
        return new Outcome(code, output.ToString(), error.ToString());
    }
}
