using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>Speed of the likelihood on one case, as ratios of times taken side by side.</summary>
internal static class LikelihoodBenchmark
{
    private const int Repetitions = 10;
    private const double ShortestSeconds = 0.02;

    /// <summary>Measures and prints.</summary>
    public static void Run(CommuteCase made)
    {
        var design = made.Design();
        var theta = made.Truth;
        double[] weight = [.. design.PersonWeight];
        const NestedLogitForm Form = NestedLogitForm.UtilityScaled;
        var scalar = new ScalarNestedLogit(design, Form, 1);
        var vector = new VectorNestedLogit(design, Form, 1);
        var two = new VectorNestedLogit(design, Form, 2);

        var one = Measurement.SideBySide(
            Repetitions, useThreadClock: true, ShortestSeconds,
            () => vector.Evaluate(theta, weight, Derivatives.Gradient),
            () => scalar.Evaluate(theta, weight, Derivatives.Gradient),
            () => vector.Evaluate(theta, weight, Derivatives.None),
            () => vector.Evaluate(theta, weight, Derivatives.Hessian),
            () => vector.Scores(theta),
            () => vector.PersonInformation(theta));
        var wall = Measurement.SideBySide(
            Repetitions, useThreadClock: false, ShortestSeconds,
            () => vector.Evaluate(theta, weight, Derivatives.Gradient),
            () => two.Evaluate(theta, weight, Derivatives.Gradient));

        FittedModel? fitted = null;
        var fit = Measurement.SideBySide(
            Repetitions, useThreadClock: true, ShortestSeconds,
            () => vector.Evaluate(theta, weight, Derivatives.Gradient),
            () => fitted = MaximumLikelihood.Fit(vector, Form, new EstimateSettings(Form, Starts: 1, Seed: 7), WorkContext.Quiet));

        Console.WriteLine(
            $"Case {made.Name}: {design.Persons} persons, {design.Situations} situations, {design.Alternatives} alternatives, " +
            $"{design.Layout.Count} parameters, {design.Store.Format.Columns.Length} stored columns; kernel {vector.Kernel}");
        Console.WriteLine($"{Repetitions} repetitions side by side, one thread, {ThreadClock.Name}; nanoseconds are the minimum for each situation");
        Console.WriteLine($"{"",-46}{"minimum",10}{"median",10}{"maximum",10}{"ns",10}");
        Print("scalar gradient pass / vector gradient pass", one[1], one[0], one[1], design);
        Print("value alone / gradient pass", one[2], one[0], one[2], design);
        Print("Hessian pass / gradient pass", one[3], one[0], one[3], design);
        Print("scores of all situations / gradient pass", one[4], one[0], one[4], design);
        Print("information of all persons / gradient pass", one[5], one[0], one[5], design);
        Print("whole fit, one start / gradient pass", fit[1], fit[0], fit[1], design);
        if (design.Situations >= VectorNestedLogit.SituationsForThreads)
            Print("1 thread / 2 threads, gradient pass, wall time", wall[0], wall[1], wall[1], design);
        Console.WriteLine(
            $"The fit ended as {fitted!.Status} after {fitted.Iterations} iterations. A vector gradient pass takes {Spread.Of(one[0]).Minimum * 1e9 / design.Situations:F1} ns " +
            "for each situation.");
        Console.WriteLine();
    }

    private static void Print(string what, double[] above, double[] below, double[] time, ChoiceDesign design)
    {
        var ratio = Spread.Of(above.Zip(below, (a, b) => a / b));
        Console.WriteLine($"{what,-46}{ratio.Minimum,10:F2}{ratio.Median,10:F2}{ratio.Maximum,10:F2}{time.Min() * 1e9 / design.Situations,10:F1}");
    }
}
