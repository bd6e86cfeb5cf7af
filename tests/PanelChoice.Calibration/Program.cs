using System.Globalization;
using PanelChoice.Calibration;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;

CultureInfo.DefaultThreadCurrentCulture = CultureInfo.CurrentCulture = CultureInfo.InvariantCulture;
if (args is ["--help"])
{
    Console.WriteLine(Cell.Usage);
    Console.WriteLine();
    Console.WriteLine(IntervalOptions.Usage);
    return 0;
}

if (args is ["intervals", .. var rest])
{
    var (options, notRead) = IntervalOptions.Read(rest);
    if (options is not null) return IntervalStudy.Run(options);
    Console.Error.WriteLine(notRead);
    Console.Error.WriteLine(IntervalOptions.Usage);
    return 64;
}

var (read, wrong) = Cell.Read(args);
if (read is not { } cell)
{
    Console.Error.WriteLine(wrong);
    Console.Error.WriteLine(Cell.Usage);
    return 64;
}

// The user's fit starts at the truth; the fit for the cause is the library's own, as in a run.
var outcomes = new DiagnosticsResult?[cell.Panels];
Parallel.For(0, cell.Panels, new ParallelOptions { MaxDegreeOfParallelism = Math.Max(1, cell.Threads) }, i =>
{
    var made = SimulatedCommutes.Make(cell.Persons, cell.Occasions, cell.Process, cell.LastChoice, cell.Seed, i);
    var model = NewtonFit.From(made.Design, NestedLogitForm.UtilityScaled, made.Truth);
    if (model.Status != FitStatus.Converged) return;
    var result = IndependenceBattery.Run(made.Study, made.Covariates, model, WorkContext.Quiet);
    if (result.Verdict != Verdict.NotApplicable) outcomes[i] = result;
});

var tested = outcomes.OfType<DiagnosticsResult>().ToList();
Console.WriteLine(
    $"{cell.Design}{(cell.Strength is { } s ? $" {s}" : "")}, {(cell.LastChoice ? "dynamic" : "static")} model, {cell.Persons} persons x {cell.Occasions} occasions, "
    + $"seed {cell.Seed}: {tested.Count} of {cell.Panels} panels fitted regularly");
Print("detector alarms (p <= .05)", r => r.Detector!.PValue <= 0.05);
Print("date score alarms (p <= .05)", r => r.DateScore is { PValue: <= 0.05 });
Print("verdict: dependence (Holm)", r => r.Verdict == Verdict.Dependence);
Print("common days", r => r.CommonDays == true);
foreach (var cause in Enum.GetValues<DependenceCause>()) Print($"cause: {cause}", r => r.Cause == cause);
Print("cause: none told", r => r.Cause is null);
return 0;

void Print(string what, Func<DiagnosticsResult, bool> holds)
{
    var share = tested.Count == 0 ? double.NaN : tested.Count(holds) / (double)tested.Count;
    Console.WriteLine($"  {what,-30} {100 * share,6:F1} +- {100 * Math.Sqrt(share * (1 - share) / tested.Count):F1} percent");
}
