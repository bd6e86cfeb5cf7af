using System.Numerics.Tensors;
using System.Runtime.InteropServices;
using PanelChoice.Likelihood;

namespace PanelChoice.Benchmarks;

/// <summary>Exponential and logarithm of a row in the first-level cache, against the vector functions of the library.</summary>
internal static class ElementaryBenchmark
{
    private const int Repetitions = 10;
    private const double ShortestSeconds = 0.02;
    private const int Lanes = 1024;
    private const int Rounds = 1000;

    /// <summary>Measures and prints.</summary>
    public static void Run()
    {
        var exponents = new double[Lanes];
        var sums = new double[Lanes];
        var to = new double[Lanes];
        for (var i = 0; i < Lanes; i++)
        {
            exponents[i] = -12.0 * i / Lanes;
            sums[i] = 1 + (5.0 * i / Lanes);
        }

        var times = Measurement.SideBySide(
            Repetitions, useThreadClock: true, ShortestSeconds,
            () => Repeat(() => VectorFunctions.Exp(ref First(exponents), ref First(to), Lanes)),
            () => Repeat(() => TensorPrimitives.Exp(exponents, to)),
            () => Repeat(() => VectorFunctions.Log(ref First(sums), ref First(to), Lanes)),
            () => Repeat(() => TensorPrimitives.Log(sums, to)));
        Console.WriteLine($"Rows of {Lanes} numbers, {Repetitions} repetitions side by side, {ThreadClock.Name}; nanoseconds are the minimum for each number");
        Console.WriteLine($"{"",-46}{"minimum",10}{"median",10}{"maximum",10}{"ns",10}{"own ns",10}");
        Print("library exp / own exp", times[1], times[0]);
        Print("library log / own log", times[3], times[2]);
        Console.WriteLine();
    }

    private static void Repeat(Action action)
    {
        for (var i = 0; i < Rounds; i++) action();
    }

    private static ref double First(double[] row) => ref MemoryMarshal.GetArrayDataReference(row);

    private static void Print(string what, double[] library, double[] own)
    {
        var ratio = Spread.Of(library.Zip(own, (a, b) => a / b));
        const double Each = 1e9 / (Lanes * Rounds);
        Console.WriteLine(
            $"{what,-46}{ratio.Minimum,10:F2}{ratio.Median,10:F2}{ratio.Maximum,10:F2}{library.Min() * Each,10:F2}{own.Min() * Each,10:F2}");
    }
}
