using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>What a fit and a refit cost, counted in gradient passes of the same run on the same thread.</summary>
internal static class FitBenchmark
{
    private const int Repetitions = 5;
    private const double ShortestSeconds = 0.02;
    private const int Refits = 8;

    /// <summary>Measures and prints.</summary>
    public static void Run(CommuteCase made)
    {
        var design = made.Design();
        double[] weight = [.. design.PersonWeight];
        const NestedLogitForm Form = NestedLogitForm.UtilityScaled;
        var likelihood = LikelihoodKernel.Create(design, Form, 1);
        FittedModel Fit(int starts) => MaximumLikelihood.Fit(likelihood, Form, new EstimateSettings(Form, starts, 7), WorkContext.Quiet);
        var model = Fit(20);
        var refitter = new ClusterRefitter(model, 1);
        ImmutableArray<RefitRequest> batch = [.. Enumerable.Range(0, Refits).Select(r => new RefitRequest(Draw(design, r), model.Parameters, []))];
        ImmutableArray<RefitOutcome> outcomes = [];

        var times = Measurement.SideBySide(
            Repetitions, useThreadClock: true, ShortestSeconds,
            () => likelihood.Evaluate(made.Truth, weight, Derivatives.Gradient),
            () => likelihood.Evaluate(made.Truth, weight, Derivatives.Hessian),
            () => Fit(1),
            () => Fit(20),
            () => outcomes = refitter.Refit(batch, CancellationToken.None));

        Console.WriteLine(
            $"Case {made.Name}: fit {model.Status}, log-likelihood {model.LogLikelihood:F6}, gradient norm {model.GradientNorm:E1}; "
            + $"{model.StartsConverged} of {model.StartsRequested} starts converged to {model.Optima.Length} maxima; "
            + $"{outcomes.Average(o => o.Iterations):F1} steps a refit");
        Console.WriteLine($"{Repetitions} repetitions side by side, one thread, {ThreadClock.Name}; in gradient passes");
        Console.WriteLine($"{"",-46}{"minimum",10}{"median",10}{"maximum",10}{"ms",10}");
        Print("Hessian pass", times[1], times[0], 1);
        Print("whole fit, 1 start", times[2], times[0], 1);
        Print("whole fit, 20 starts", times[3], times[0], 1);
        Print("one refit on clusters drawn with replacement", times[4], times[0], Refits);
        Console.WriteLine();
    }

    private static ImmutableArray<double> Draw(ChoiceDesign design, int replicate)
    {
        var random = new CounterRandom(7, "benchmark refits", replicate);
        var weight = new double[design.Clusters.Length];
        for (var i = 0; i < weight.Length; i++) weight[random.Next(weight.Length)]++;
        return [.. weight];
    }

    private static void Print(string what, double[] above, double[] below, int units)
    {
        var ratio = Spread.Of(above.Zip(below, (a, b) => a / b / units));
        Console.WriteLine($"{what,-46}{ratio.Minimum,10:F1}{ratio.Median,10:F1}{ratio.Maximum,10:F1}{above.Min() * 1e3 / units,10:F1}");
    }
}
