using System.Globalization;
using PanelChoice.Benchmarks;

// Prints speed as ratios of things measured in one run; --help tells the options.
CultureInfo.DefaultThreadCurrentCulture = CultureInfo.CurrentCulture = CultureInfo.InvariantCulture;
return BenchmarkCommand.Run(args);
