using System.Globalization;
using PanelChoice.Numerics;
using Spectre.Console;
using Spectre.Console.Rendering;

namespace PanelChoice.Cli;

/// <summary>Shows how far long steps have come, with rate and time left, on standard error and only to a person at a terminal.</summary>
internal static class ProgressDisplay
{
    /// <summary>Runs something and shows its progress.</summary>
    /// <typeparam name="T">What it gives.</typeparam>
    /// <param name="options">Threads, quiet, terminal, cancellation.</param>
    /// <param name="work">What to run.</param>
    public static T Run<T>(RunOptions options, Func<WorkContext, T> work)
    {
        if (options.Quiet || !options.Terminal.ErrorIsTerminal) return work(new WorkContext(options.Threads, null, options.Cancellation));
        var console = AnsiConsole.Create(new AnsiConsoleSettings
        {
            ColorSystem = options.Colour ? ColorSystemSupport.Detect : ColorSystemSupport.NoColors,
            Out = new AnsiConsoleOutput(options.Terminal.Error),
        });
        return console.Progress()
            .AutoClear(true)
            .Columns(new TaskDescriptionColumn { Alignment = Justify.Left }, new ProgressBarColumn { Width = 24 }, new RateColumn(), new TimeLeftColumn())
            .Start(display => work(new WorkContext(options.Threads, new Steps(display), options.Cancellation)));
    }

    /// <summary>One line for each step, in the order in which steps first report.</summary>
    private sealed class Steps(ProgressContext display) : IProgress<WorkProgress>
    {
        private readonly Dictionary<string, ProgressTask> tasks = new(StringComparer.Ordinal);
        private readonly Lock gate = new();

        public void Report(WorkProgress value)
        {
            lock (gate)
            {
                if (!tasks.TryGetValue(value.Step, out var task))
                    tasks[value.Step] = task = display.AddTask(Markup.Escape(value.Step), new ProgressTaskSettings { MaxValue = Math.Max(1, value.Total) });
                task.MaxValue = Math.Max(1, value.Total);
                // Reports of several threads may arrive out of order; a bar never goes back.
                task.Value = Math.Max(task.Value, value.Done);
                if (value.Done >= value.Total) task.StopTask();
            }
        }
    }

    private sealed class RateColumn : ProgressColumn
    {
        public override IRenderable Render(RenderOptions options, ProgressTask task, TimeSpan deltaTime)
        {
            var counts = string.Create(CultureInfo.InvariantCulture, $"{task.Value:#,0} of {task.MaxValue:#,0}");
            var seconds = task.ElapsedTime?.TotalSeconds ?? 0;
            return new Text(seconds > 0.5 && task.Value > 0
                ? string.Create(CultureInfo.InvariantCulture, $"{counts}, {task.Value / seconds:0.#} per second")
                : counts);
        }
    }

    private sealed class TimeLeftColumn : ProgressColumn
    {
        public override IRenderable Render(RenderOptions options, ProgressTask task, TimeSpan deltaTime)
        {
            var seconds = task.ElapsedTime?.TotalSeconds ?? 0;
            if (task.IsFinished || task.Value <= 0 || seconds < 0.5) return new Text(task.IsFinished ? "done" : "");
            var left = TimeSpan.FromSeconds((task.MaxValue - task.Value) * seconds / task.Value);
            return new Text(left.TotalMinutes >= 1
                ? string.Create(CultureInfo.InvariantCulture, $"{(int)left.TotalMinutes} min {left.Seconds:00} s left")
                : string.Create(CultureInfo.InvariantCulture, $"{Math.Ceiling(left.TotalSeconds):0} s left"));
        }
    }
}
