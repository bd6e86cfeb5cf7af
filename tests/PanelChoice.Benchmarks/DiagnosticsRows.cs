using PanelChoice.Diagnostics;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;

namespace PanelChoice.Benchmarks;

/// <summary>All scores of the independence battery on a fitted model, in gradient passes: from the vector kernel's rows, and from the scalar reference.</summary>
internal static class DiagnosticsRows
{
    private const int Repetitions = 5;
    private const double SameMethod = 1e-10;

    /// <summary>Measures the battery without and with the date score.</summary>
    public static void Battery(CaseAtWork work)
    {
        var occasions = work.Made.Shape.Occasions;
        var days = CompactNumbers.Of(Enumerable.Range(0, work.Design.Situations).Select(t => (long)(t % occasions)));
        var positions = new OccasionPositions(
            [.. Enumerable.Range(0, work.Design.Situations).Select(t => days[t])], [.. new int[work.Design.Situations]], 1, "step");
        var model = work.Model;
        ScoreBattery? vector = null, scalar = null;
        var times = Measurement.OfThread(
            Repetitions,
            () => work.GradientPass(),
            () => Compute("vector", null),
            () => vector = Compute("vector", days),
            () => scalar = Compute("scalar", days));
        RatioTable.Row("", "independence battery on a fitted model / gradient pass", work.Label, times[1], times[0]);
        RatioTable.Row("", "the same with the date score / gradient pass", work.Label, times[2], times[0]);
        RatioTable.Row("", "that from residuals of the scalar reference / from the kernel's rows", work.Label, times[3], times[2]);
        foreach (var (expected, actual) in scalar!.Decays.Zip(vector!.Decays))
            Agreement.Holds(Math.Abs(expected.Z - actual.Z) <= SameMethod * Math.Max(1, Math.Abs(expected.Z)), $"{work.Label}: z is {actual.Z:R} and should be {expected.Z:R}");

        ScoreBattery Compute(string kernel, CompactNumbers? dates) => ScoreBattery.Compute(
            ResidualKernel.Create(work.Design, model.Form, model.Parameters.AsSpan(), kernel), positions, CauseEvidence.LargestLag, dates, false, 1)!;
    }
}
