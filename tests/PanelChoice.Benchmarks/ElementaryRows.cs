using System.Numerics.Tensors;
using System.Runtime.InteropServices;
using PanelChoice.Likelihood;

namespace PanelChoice.Benchmarks;

/// <summary>Exponential and logarithm of a row in the first-level cache: the runtime's vector functions against the library's.</summary>
internal static class ElementaryRows
{
    private const int Repetitions = 10;
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

        var times = Measurement.OfThread(
            Repetitions,
            () => Repeat(() => VectorFunctions.Exp(ref First(exponents), ref First(to), Lanes)),
            () => Repeat(() => TensorPrimitives.Exp(exponents, to)),
            () => Repeat(() => VectorFunctions.Log(ref First(sums), ref First(to), Lanes)),
            () => Repeat(() => TensorPrimitives.Log(sums, to)));
        RatioTable.Row("", "exponentials, the runtime's / own", $"{Lanes} x {Rounds}", times[1], times[0]);
        RatioTable.Row("", "logarithms, the runtime's / own", $"{Lanes} x {Rounds}", times[3], times[2]);
        double Each(double[] seconds) => seconds.Min() * 1e9 / (Lanes * Rounds);
        RatioTable.Remark($"ns for each number: own exp {Each(times[0]):F2}, own log {Each(times[2]):F2}; the runtime's {Each(times[1]):F2}, {Each(times[3]):F2}");
    }

    private static void Repeat(Action action)
    {
        for (var i = 0; i < Rounds; i++) action();
    }

    private static ref double First(double[] row) => ref MemoryMarshal.GetArrayDataReference(row);
}
