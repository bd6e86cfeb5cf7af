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
    public static T Run<T>(RunOptions options, Func<WorkContext, T> work) => Run(options, (context, _) => work(context));

    /// <summary>Runs something that has lines to tell while its progress is shown.</summary>
    /// <typeparam name="T">What it gives.</typeparam>
    /// <param name="options">Threads, quiet, terminal, cancellation.</param>
    /// <param name="work">What to run, given what tells a line.</param>
    public static T Run<T>(RunOptions options, Func<WorkContext, Action<string>, T> work)
    {
        if (options.Quiet || !options.Terminal.ErrorIsTerminal) return work(new WorkContext(options.Threads, null, options.Cancellation), options.Terminal.Tell);
        var console = AnsiConsole.Create(new AnsiConsoleSettings
        {
            Ansi = AnsiSupport.Yes,
            Interactive = InteractionSupport.Yes,
            ColorSystem = options.Terminal.AllowsColour && !options.NoColour ? ColorSystemSupport.Standard : ColorSystemSupport.NoColors,
            Out = new AnsiConsoleOutput(options.Terminal.Error),
        });
        return console.Progress()
            .AutoClear(true)
            .Columns(new TaskDescriptionColumn { Alignment = Justify.Left }, new ProgressBarColumn { Width = 16 }, new RateColumn(), new TimeLeftColumn())
            .Start(display => work(
                new WorkContext(options.Threads, new Steps(display), options.Cancellation),
                // Through the display, which moves its bars below the line.
                line => console.WriteLine(Printable.Of(line))));
    }

    /// <summary>Name under which a line keeps how many units an earlier run had done: they took no time here.</summary>
    private const string Found = "found";

    private static double DoneHere(ProgressTask task) => task.Value - task.State.Get<long>(Found);

    /// <summary>One line for each step, in the order in which steps first report.</summary>
    private sealed class Steps(ProgressContext display) : IProgress<WorkProgress>
    {
        private readonly Dictionary<string, ProgressTask> tasks = new(StringComparer.Ordinal);
        private readonly Lock gate = new();

        public void Report(WorkProgress value)
        {
            lock (gate)
            {
                // A step that starts anew (a second fit, say) gets a line of its own.
                if (!tasks.TryGetValue(value.Step, out var task) || (task.IsFinished && value.Done < value.Total))
                    tasks[value.Step] = task = display.AddTask(Markup.Escape(value.Step), new ProgressTaskSettings { MaxValue = Math.Max(1, value.Total) });
                if (value.Found > 0) task.State.Update<long>(Found, _ => value.Found);
                task.MaxValue = Math.Max(1, value.Total);
                // Reports of several threads may arrive out of order; a bar never goes back.
                task.Value = Math.Max(task.Value, value.Done);
                if (value.Done >= value.Total) task.StopTask();
            }
        }
    }

    private sealed class RateColumn : ProgressColumn
    {
        protected override bool NoWrap => true;

        public override IRenderable Render(RenderOptions options, ProgressTask task, TimeSpan deltaTime)
        {
            var counts = string.Create(CultureInfo.InvariantCulture, $"{task.Value:#,0} of {task.MaxValue:#,0}");
            var seconds = task.ElapsedTime?.TotalSeconds ?? 0;
            if (task.State.Get<long>(Found) is var found and > 0) counts += string.Create(CultureInfo.InvariantCulture, $", {found:#,0} found");
            var rate = DoneHere(task) / Math.Max(seconds, 1e-3);
            return new Text(seconds > 0.5 && rate > 0 && !task.IsFinished
                ? string.Create(CultureInfo.InvariantCulture, $"{counts}, {(rate < 10 ? Math.Round(rate, 1) : Math.Round(rate))} per second")
                : counts);
        }
    }

    private sealed class TimeLeftColumn : ProgressColumn
    {
        protected override bool NoWrap => true;

        public override IRenderable Render(RenderOptions options, ProgressTask task, TimeSpan deltaTime)
        {
            var seconds = task.ElapsedTime?.TotalSeconds ?? 0;
            if (task.IsFinished || DoneHere(task) <= 0 || seconds < 0.5) return new Text(task.IsFinished ? "done" : "");
            var left = TimeSpan.FromSeconds((task.MaxValue - task.Value) * seconds / DoneHere(task));
            return new Text(left.TotalMinutes >= 1
                ? string.Create(CultureInfo.InvariantCulture, $"{(int)left.TotalMinutes} min {left.Seconds:00} s left")
                : string.Create(CultureInfo.InvariantCulture, $"{Math.Ceiling(left.TotalSeconds):0} s left"));
        }
    }
}
