using System.CommandLine;
using System.CommandLine.Parsing;
using System.Globalization;

namespace PanelChoice.Cli;

/// <summary>The options <c>--store</c> and <c>--memory</c> of a command.</summary>
internal sealed class StoreOptions
{
    private readonly Option<string> store;
    private readonly Option<int?> memory;

    /// <summary>Adds the options to a command.</summary>
    /// <param name="command">The command.</param>
    /// <param name="path">Makes an option that names a file: name, description, what it names.</param>
    public StoreOptions(Command command, Func<string, string, string, Option<string>> path)
    {
        store = path("--store", "Keep the built design in this file, or take it from there, and read it as it is needed: for panels larger than memory.", "FILE");
        memory = new Option<int?>("--memory")
        {
            Description = $"With --store: megabytes that the panel may take in memory (default {KeptDesign.UsualMegabytes}).", HelpName = "MB", CustomParser = Megabytes,
        };
        command.Add(store);
        command.Add(memory);
        command.Validators.Add(result =>
        {
            if (result.GetResult(memory) is not null && result.GetResult(store) is null) result.AddError("--memory says how much of a store is held in memory, so it needs --store.");
        });
    }

    /// <summary>What the user asked for; null where the design is to be in memory.</summary>
    public KeptDesign? Of(ParseResult parsed) =>
        parsed.GetValue(store) is { } file ? new KeptDesign(file, parsed.GetValue(memory) ?? KeptDesign.UsualMegabytes) : null;

    /// <summary>Whether a store is named on the command line.</summary>
    public bool AreIn(CommandResult result) => result.GetResult(store) is not null;

    private static int? Megabytes(ArgumentResult result)
    {
        var text = result.Tokens[0].Value;
        if (int.TryParse(text, NumberStyles.None, CultureInfo.InvariantCulture, out var n) && n >= 1) return n;
        result.AddError($"--memory needs a whole number of megabytes, not '{text}'.");
        return null;
    }
}
