using System.Globalization;
using PanelChoice.Benchmarks;

// Prints the speed of exp and log, of the likelihood and of fits as ratios measured in one run: dotnet run -c Release --project tests/PanelChoice.Benchmarks -- [--case S|M]
CultureInfo.DefaultThreadCurrentCulture = CultureInfo.CurrentCulture = CultureInfo.InvariantCulture;
string[] cases;
switch (args)
{
    case []:
        cases = ["S", "M"];
        break;
    case ["--case", "S" or "M"]:
        cases = [args[1]];
        break;
    default:
        Console.Error.WriteLine("Usage: PanelChoice.Benchmarks [--case S|M]");
        return 64;
}

ElementaryBenchmark.Run();
foreach (var name in cases)
{
    var made = name == "S" ? CommuteCase.Small() : CommuteCase.Medium();
    LikelihoodBenchmark.Run(made);
    FitBenchmark.Run(made);
}

return 0;
