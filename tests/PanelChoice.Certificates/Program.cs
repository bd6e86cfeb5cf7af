using System.Globalization;
using PanelChoice.Certificates;
using PanelChoice.Study;

CultureInfo.DefaultThreadCurrentCulture = CultureInfo.CurrentCulture = CultureInfo.InvariantCulture;
if (args is ["--help"])
{
    Console.WriteLine(StudyOptions.Usage);
    return 0;
}

var (read, wrong) = StudyOptions.Read(args);
if (read is not { } options)
{
    Console.Error.WriteLine(wrong);
    Console.Error.WriteLine(StudyOptions.Usage);
    return 64;
}

var all = new Distances[options.Panels];
Parallel.For(0, options.Panels, new ParallelOptions { MaxDegreeOfParallelism = options.Threads }, i => all[i] = Distances.Of(options, i));

var fitted = all.Where(d => d.Panel is not null).ToList();
var table = new DistanceTable(options.Tolerance);
Console.WriteLine($"{fitted.Count} of {options.Panels} panels fitted regularly; seed {options.Seed}, tolerance {options.Tolerance:E0}");
Console.WriteLine();
DistanceTable.Head();
table.Row("side by side, own Hessian", fitted.SelectMany(d => d.OwnHessian));
table.Row("side by side, sample's Hessian", fitted.SelectMany(d => d.SampleHessian));
table.Row("exact Newton steps", fitted.SelectMany(d => d.Exact));
Console.WriteLine();
SideBySide("8 to 15 clusters", d => d.Clusters <= 15);
SideBySide("16 to 60 clusters", d => d.Clusters is > 15 and <= 60);
SideBySide("more than 60 clusters", d => d.Clusters > 60);
foreach (var nests in fitted.Select(d => d.Panel!.Nests).Distinct().Order(StringComparer.Ordinal)) SideBySide(nests, d => d.Panel!.Nests == nests);
SideBySide("unscaled", d => d.Panel!.Form == NestedLogitForm.Unscaled);
SideBySide("with the last choice", d => d.Panel!.HasHabit);
SideBySide("unequal weights", d => d.Panel!.IsWeighted);
SideBySide("households", d => d.Panel!.Design.ClusterBy == "household");
Console.WriteLine();
Console.WriteLine($"{fitted.Sum(d => d.Failed)} replicates have no maximum. A replicate beyond its certificate ends this program with 1.");
return table.Exceeded ? 1 : 0;

void SideBySide(string what, Func<Distances, bool> holds) => table.Row(what, fitted.Where(holds).SelectMany(d => d.OwnHessian.Concat(d.SampleHessian)));
