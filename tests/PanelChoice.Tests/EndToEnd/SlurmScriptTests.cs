using System.Diagnostics;
using Xunit;

namespace PanelChoice.Tests.EndToEnd;

/// <summary>The job scripts by themselves: what they send, and what a job does. A real Slurm runs them outside these tests.</summary>
public sealed class SlurmScriptTests
{
    private static readonly string Scripts = Path.Combine(AppContext.BaseDirectory, "Slurm");

    [Fact]
    public void An_array_and_the_job_that_gathers_it_are_sent_and_make_the_result()
    {
        if (OperatingSystem.IsWindows()) return;
        using var study = new SmallStudy();
        // Stands for the program that takes jobs: writes down what it is given and which program the jobs shall run.
        var bin = Directory.CreateDirectory(study.PathOf("bin")).FullName;
        var sbatch = Path.Combine(bin, "sbatch");
        File.WriteAllText(sbatch, $"#!/bin/bash\necho \"$PANELCHOICE|$*\" >>'{study.PathOf("sent")}'\necho \"$((40 + $(wc -l <'{study.PathOf("sent")}')));cluster\"\n");
        File.SetUnixFileMode(sbatch, UnixFileMode.UserRead | UnixFileMode.UserWrite | UnixFileMode.UserExecute);
        var outside = new Dictionary<string, string> { ["PATH"] = bin + ":" + Environment.GetEnvironmentVariable("PATH") };

        var told = Bash(study, outside, "submit.sh", "study.toml", "2", "parts", "--mem=8G", "--time=1:00:00");
        Assert.Equal((0, ""), (told.Code, told.Error));
        Assert.Equal("array 41 makes 2 parts, job 42 gathers them; everything goes to parts\n", told.Out);
        var program = Path.Combine(AppContext.BaseDirectory, "PanelChoice.Cli.dll");
        Assert.Equal(
            [
                $"{program}|--parsable --array=1-2 --output=parts/part-%a.log --mem=8G --time=1:00:00 {Scripts}/part.sh study.toml 2 parts",
                $"{program}|--parsable --dependency=afterany:41 --output=parts/gather.log --mem=8G --time=1:00:00 {Scripts}/gather.sh parts",
            ],
            File.ReadAllLines(study.PathOf("sent")));

        foreach (var task in new[] { "2", "1" })
        {
            var job = new Dictionary<string, string>
            {
                ["PANELCHOICE"] = program, ["SLURM_ARRAY_TASK_ID"] = task, ["SLURM_ARRAY_JOB_ID"] = "41", ["SLURM_CPUS_PER_TASK"] = "2",
            };
            var part = Bash(study, job, "part.sh", "study.toml", "2", "parts");
            Assert.Equal((0, ""), (part.Code, part.Error));
            Assert.StartsWith($"part {task} of 2, job 41_{task} on this node, restarts so far: 0\n", part.Out, StringComparison.Ordinal);
        }

        Assert.Equal(0, Bash(study, new Dictionary<string, string> { ["PANELCHOICE"] = program }, "gather.sh", "parts").Code);
        CommandLineProcess.InProcess("estimate", study.StudyFile, "--out", study.PathOf("whole"));
        Assert.Equal(File.ReadAllBytes(Path.Combine(study.PathOf("whole"), "result.json")), File.ReadAllBytes(Path.Combine(study.PathOf("parts"), "result.json")));
    }

    [Theory]
    [InlineData(64, "usage: submit.sh STUDY PARTS DIR")]
    [InlineData(64, "usage: submit.sh STUDY PARTS DIR", "study.toml", "many", "parts")]
    [InlineData(64, "usage: submit.sh STUDY PARTS DIR", "study.toml", "0", "parts")]
    [InlineData(66, "submit.sh: nowhere.toml: there is no such study file", "nowhere.toml", "3", "parts")]
    public void What_cannot_be_sent_is_told_and_nothing_is_made(int code, string message, params string[] args)
    {
        if (OperatingSystem.IsWindows()) return;
        using var study = new SmallStudy();
        var told = Bash(study, new Dictionary<string, string>(), "submit.sh", args);
        Assert.Equal((code, ""), (told.Code, told.Out));
        Assert.StartsWith(message, told.Error, StringComparison.Ordinal);
        Assert.Empty(study.OtherFiles());
    }

    private static Outcome Bash(SmallStudy study, IReadOnlyDictionary<string, string> variables, string script, params string[] args)
    {
        var start = new ProcessStartInfo("bash", [Path.Combine(Scripts, script), .. args])
        {
            WorkingDirectory = study.Folder, RedirectStandardOutput = true, RedirectStandardError = true, UseShellExecute = false,
        };
        foreach (var name in start.Environment.Keys.Where(k => k.StartsWith("SLURM", StringComparison.Ordinal) || k == "PANELCHOICE").ToList()) start.Environment.Remove(name);
        foreach (var (name, value) in variables) start.Environment[name] = value;
        using var process = Process.Start(start)!;
        var error = process.StandardError.ReadToEndAsync();
        var output = process.StandardOutput.ReadToEnd();
        process.WaitForExit();
        return new Outcome(process.ExitCode, output, error.Result);
    }
}
