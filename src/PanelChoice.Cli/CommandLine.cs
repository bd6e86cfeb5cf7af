using System.CommandLine;
using System.CommandLine.Help;
using System.CommandLine.Invocation;
using System.CommandLine.Parsing;
using System.Reflection;
using PanelChoice.Cli.Commands;
using PanelChoice.Cli.Report;
using PanelChoice.Inference;

namespace PanelChoice.Cli;

/// <summary>The commands, their options, and what becomes of everything that can go wrong.</summary>
internal static class CommandLine
{
    private const string Closing = "Run 'panelchoice --help' to see the commands.";

    /// <summary>Runs one command line.</summary>
    /// <param name="args">Arguments without the program's name.</param>
    /// <param name="terminal">Where to write.</param>
    /// <param name="cancellation">Set by the user's interrupt.</param>
    /// <returns>The exit code.</returns>
    public static int Run(IReadOnlyList<string> args, Terminal terminal, CancellationToken cancellation)
    {
        // Response files would make an argument such as @home mean something else than it says.
        var parsed = Root(terminal, cancellation).Parse(args, new ParserConfiguration { ResponseFileTokenReplacer = null });
        if (parsed.Errors.Count > 0)
        {
            foreach (var message in Messages(parsed)) terminal.Problem(message);
            terminal.Tell(Closing);
            return ExitCode.Usage;
        }

        try
        {
            return parsed.Invoke(new InvocationConfiguration
            {
                Output = terminal.Out, Error = terminal.Error, EnableDefaultExceptionHandler = false, ProcessTerminationTimeout = null,
            });
        }
        catch (OperationCanceledException) when (cancellation.IsCancellationRequested)
        {
            terminal.Problem("stopped before it was done; nothing was written.");
            return ExitCode.Interrupted;
        }
        catch (OutputException unwritable)
        {
            terminal.Problem(unwritable.Message);
            return ExitCode.CannotWrite;
        }
#pragma warning disable CA1031 // The last line of defence: whatever is wrong inside, the user sees one line and a code that says so.
        catch (Exception fault)
#pragma warning restore CA1031
        {
            var inner = fault is AggregateException { InnerExceptions: [var only] } ? only : fault;
            terminal.Problem($"internal error ({inner.GetType().Name}): {inner.Message}");
            return ExitCode.Internal;
        }
    }

    // A mistyped command is told as such; that therefore no command was given goes without saying.
    private static List<string> Messages(ParseResult parsed)
    {
        var messages = parsed.Errors.Select(e => e.Message).Distinct().ToList();
        var unknown = messages.Where(m => m.StartsWith("Unrecognized", StringComparison.Ordinal)).ToList();
        return unknown.Count > 0 && parsed.CommandResult.Command is RootCommand ? unknown : messages;
    }

    private static RootCommand Root(Terminal terminal, CancellationToken cancellation)
    {
        var root = new RootCommand("From a raw panel of repeated travel choices to estimates, honest standard errors and a verdict on independence.");
        root.HelpName = "panelchoice";
        foreach (var option in root.Options.OfType<VersionOption>()) option.Action = new TellVersion();
        foreach (var option in root.Options.OfType<HelpOption>()) option.Action = new HelpAction { MaxWidth = Letter.Width };
        var threads = new Option<int>("--threads")
        {
            Description = "Threads to use; no figure depends on it.", HelpName = "N", Recursive = true,
            DefaultValueFactory = _ => Environment.ProcessorCount,
            CustomParser = result =>
            {
                var text = result.Tokens[0].Value;
                if (int.TryParse(text, System.Globalization.NumberStyles.None, System.Globalization.CultureInfo.InvariantCulture, out var n) && n >= 1) return n;
                result.AddError($"--threads needs a whole number of 1 or more, not '{text}'.");
                return 0;
            },
        };
        var quiet = new Option<bool>("--quiet") { Description = "Print no tables and no progress; problems are still told.", Recursive = true };
        var noColour = new Option<bool>("--no-color") { Description = "Plain text even on a terminal; the variable NO_COLOR does the same.", Recursive = true };
        root.Add(threads);
        root.Add(quiet);
        root.Add(noColour);
        RunOptions Options(ParseResult r) => new(
            r.GetValue(threads), r.GetValue(quiet), r.GetValue(noColour), terminal, cancellation);

        root.Add(Check(Options));
        root.Add(Build(Options));
        root.Add(Estimate(Options));
        root.Add(Bootstrap(Options));
        root.Add(Gather(Options));
        root.Add(Demo(Options));
        return root;
    }

    private static Command Check(Func<ParseResult, RunOptions> options)
    {
        var study = Study();
        var json = Path("--json", "Also write the profile to this file.", "FILE");
        var command = new Command("check", "Reads and checks the panel and prints its profile.") { study, json };
        command.SetAction(r => CheckCommand.Run(r.GetRequiredValue(study), r.GetValue(json), options(r)));
        return command;
    }

    private static Command Build(Func<ParseResult, RunOptions> options)
    {
        var study = Study();
        var output = Path("--out", "Write the covariates to this file (.csv or .parquet).", "FILE");
        output.Validators.Add(result =>
        {
            var file = result.GetValueOrDefault<string>();
            if (!string.IsNullOrWhiteSpace(file) && !BuildCommand.Writes(file)) result.AddError($"--out needs a file that ends in .csv or .parquet, not '{file}'.");
        });
        var command = new Command("build", "Builds the covariates: lagged choices, lagged attributes, habit stocks and the rest.") { study, output };
        var store = new StoreOptions(command, Path);
        command.Validators.Add(result =>
        {
            if (result.GetResult(output) is not null && store.AreIn(result))
                result.AddError("--out writes covariates that are held in memory, --store a design that is not; give one of them.");
        });
        command.SetAction(r => store.Of(r) is { } kept
            ? BuildCommand.Run(r.GetRequiredValue(study), kept, options(r))
            : BuildCommand.Run(r.GetRequiredValue(study), r.GetValue(output), options(r)));
        return command;
    }

    private static Command Estimate(Func<ParseResult, RunOptions> options)
    {
        var study = Study();
        var output = Path("--out", "Write result.json, coefficients.csv and replicates.parquet to this folder.", "DIR");
        var strict = Strict();
        var command = new Command("estimate", "The main job: fit, standard errors side by side, diagnostics, verdict.") { study, output, strict };
        var showIds = new Option<bool>("--show-ids") { Description = "Name persons by their ids where they drive a result; not to be passed on." };
        command.Add(showIds);
        var store = new StoreOptions(command, Path);
        command.SetAction(r => EstimateCommand.Run(r.GetRequiredValue(study), r.GetValue(output), r.GetValue(strict), r.GetValue(showIds), store.Of(r), options(r)));
        return command;
    }

    private static Command Bootstrap(Func<ParseResult, RunOptions> options)
    {
        var study = Study();
        var part = new Option<RefitShare>("--part")
        {
            Description = "Which part to make, and of how many: 3/16.", HelpName = "I/N", Required = true,
            CustomParser = result =>
            {
                if (RefitShare.Parse(result.Tokens[0].Value) is { } share) return share;
                result.AddError($"--part needs a number and how many parts there are, such as 3/16, not '{result.Tokens[0].Value}'.");
                return null!;
            },
        };
        var output = Path("--out", "Folder of the parts; all parts of an analysis go into one.", "DIR");
        output.Required = true;
        var command = new Command("bootstrap", "Makes one part of the bootstrap's and the jackknife's refits, for 'gather' to join.") { study, part, output };
        var store = new StoreOptions(command, Path);
        command.SetAction(r => BootstrapCommand.Run(
            r.GetRequiredValue(study), r.GetRequiredValue(part), r.GetRequiredValue(output), store.Of(r), options(r)));
        return command;
    }

    private static Command Gather(Func<ParseResult, RunOptions> options)
    {
        var folder = new Argument<string>("DIR") { Description = "The folder of the parts." };
        folder.Validators.Add(result => Named(result, "DIR"));
        var study = Path("--study", "The study file, where it is no longer where the parts saw it.", "FILE");
        var output = Path("--out", "Write result.json, coefficients.csv and replicates.parquet here and not to the folder of the parts.", "DIR");
        var strict = Strict();
        var command = new Command("gather", "Joins the parts that 'bootstrap' made and ends as 'estimate' does, bit for bit.") { folder, study, output, strict };
        var store = new StoreOptions(command, Path);
        command.SetAction(r => GatherCommand.Run(
            r.GetRequiredValue(folder), r.GetValue(study), r.GetValue(output), r.GetValue(strict), store.Of(r), options(r)));
        return command;
    }

    private static Command Demo(Func<ParseResult, RunOptions> options)
    {
        var folder = new Argument<string>("DIR")
        {
            Description = "Folder for the demo; it is made when it does not exist.", Arity = ArgumentArity.ZeroOrOne, DefaultValueFactory = _ => "panelchoice-demo",
        };
        folder.Validators.Add(result => Named(result, "DIR"));
        var strict = Strict();
        var command = new Command("demo", "Writes two invented panels with their study files and runs 'estimate' on both.") { folder, strict };
        command.SetAction(r => DemoCommand.Run(r.GetRequiredValue(folder), r.GetValue(strict), options(r)));
        return command;
    }

    private static Argument<string> Study()
    {
        var study = new Argument<string>("STUDY") { Description = "The study file (TOML)." };
        study.Validators.Add(result => Named(result, "STUDY"));
        return study;
    }

    private static Option<string> Path(string name, string description, string what)
    {
        var option = new Option<string>(name) { Description = description, HelpName = what };
        option.Validators.Add(result => Named(result, name));
        return option;
    }

    // An empty name is what an unset variable of a script leaves behind.
    private static void Named(SymbolResult result, string name)
    {
        if (result.Tokens.Any(t => string.IsNullOrWhiteSpace(t.Value))) result.AddError($"{name} needs a name, not an empty text.");
    }

    private static Option<bool> Strict() => new("--strict") { Description = "End with exit code 3 when dependence is flagged." };

    private sealed class TellVersion : SynchronousCommandLineAction
    {
        public override int Invoke(ParseResult parseResult)
        {
            var version = typeof(PanelAnalysis).Assembly.GetCustomAttribute<AssemblyInformationalVersionAttribute>()!.InformationalVersion.Split('+')[0];
            parseResult.InvocationConfiguration.Output.WriteLine("panelchoice " + version);
            return ExitCode.Done;
        }
    }
}
