using System.Diagnostics;
using System.Globalization;
using System.Runtime.InteropServices;

namespace PanelChoice.Benchmarks;

/// <summary>What a process came to.</summary>
/// <param name="Code">Exit code.</param>
/// <param name="Output">Standard output.</param>
/// <param name="WallSeconds">From start to end.</param>
/// <param name="ProcessorSeconds">Processor time of all its threads.</param>
/// <param name="PeakBytes">Peak resident memory (VmHWM); 0 where the system does not tell.</param>
internal sealed record ChildOutcome(int Code, string Output, double WallSeconds, double ProcessorSeconds, long PeakBytes);

/// <summary>Runs a program of this build in a process of its own and watches its time and memory.</summary>
internal static partial class ChildProcess
{
    private const int Children = -1;

    /// <summary>Runs the command line of PanelChoice.</summary>
    public static ChildOutcome CommandLine(params string[] args) => Run("PanelChoice.Cli.dll", new Dictionary<string, string>(), args);

    /// <summary>Runs this program.</summary>
    /// <param name="variables">Variables to set.</param>
    /// <param name="args">Its arguments.</param>
    public static ChildOutcome Benchmarks(IReadOnlyDictionary<string, string> variables, params string[] args) => Run("PanelChoice.Benchmarks.dll", variables, args);

    /// <summary>Peak resident memory of a running process, in bytes; 0 where the system does not tell or the process is gone.</summary>
    /// <param name="id">Its number; "self" for this one.</param>
    public static long PeakOf(string id)
    {
        try
        {
            var line = File.ReadLines($"/proc/{id}/status").FirstOrDefault(l => l.StartsWith("VmHWM:", StringComparison.Ordinal));
            return line is null ? 0 : long.Parse(line["VmHWM:".Length..].Replace("kB", "", StringComparison.Ordinal), NumberStyles.AllowLeadingWhite | NumberStyles.AllowTrailingWhite, CultureInfo.InvariantCulture) * 1024;
        }
        catch (IOException)
        {
            return 0;
        }
    }

    private static ChildOutcome Run(string program, IReadOnlyDictionary<string, string> variables, string[] args)
    {
        var start = new ProcessStartInfo("dotnet", [Path.Combine(AppContext.BaseDirectory, program), .. args]) { RedirectStandardOutput = true, UseShellExecute = false };
        foreach (var (name, value) in variables) start.Environment[name] = value;
        var processorBefore = ProcessorSecondsOfChildren();
        var from = Measurement.Wall();
        using var process = Process.Start(start)!;
        var output = process.StandardOutput.ReadToEndAsync();
        var peak = 0L;
        // The peak only grows, so that the last look before the end tells it.
        while (!process.WaitForExit(10)) peak = Math.Max(peak, PeakOf(process.Id.ToString(CultureInfo.InvariantCulture)));
        process.WaitForExit();
        var wall = Measurement.Wall() - from;
        return new ChildOutcome(process.ExitCode, output.Result, wall, ProcessorSecondsOfChildren() - processorBefore, peak);
    }

    private static double ProcessorSecondsOfChildren()
    {
        if (!OperatingSystem.IsLinux() || ReadUsage(Children, out var usage) != 0) return double.NaN;
        return usage.UserSeconds + usage.SystemSeconds + ((usage.UserMicroseconds + usage.SystemMicroseconds) * 1e-6);
    }

    [LibraryImport("libc", EntryPoint = "getrusage")]
    private static partial int ReadUsage(int who, out ResourceUsage usage);

    /// <summary>The head of the system's structure; the rest only takes room.</summary>
    [StructLayout(LayoutKind.Sequential, Size = 144)]
    private struct ResourceUsage
    {
        public long UserSeconds;
        public long UserMicroseconds;
        public long SystemSeconds;
        public long SystemMicroseconds;
    }
}
