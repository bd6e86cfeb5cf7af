using PanelChoice.Likelihood;

namespace PanelChoice.Benchmarks;

/// <summary>Passes over the data: against scalar code, against a plain read, with the Hessian, with two threads.</summary>
internal static class LikelihoodRows
{
    private const int Repetitions = 10;
    private const double SameSums = 1e-12;

    /// <summary>The gradient pass against scalar code.</summary>
    public static void Gradient(CaseAtWork work)
    {
        var plain = new PlainScalar(work.Made);
        var yardstick = new TunedScalar(work.Made);
        var readable = new ScalarNestedLogit(work.Design, CommuteCase.Form, 1);
        var gradient = new double[work.Theta.Length];
        var value = yardstick.Evaluate(work.Theta, gradient);
        var pass = work.GradientPass();
        Agreement.Close($"{work.Label}: kernel and tuned scalar", pass.Value, pass.Gradient.AsSpan(), value, gradient, SameSums);
        value = plain.Evaluate(work.Theta, gradient);
        Agreement.Close($"{work.Label}: kernel and plain scalar", pass.Value, pass.Gradient.AsSpan(), value, gradient, SameSums);

        var times = Measurement.OfThread(
            Repetitions,
            () => work.GradientPass(),
            () => yardstick.Evaluate(work.Theta, gradient),
            () => plain.Evaluate(work.Theta, gradient),
            () => readable.Evaluate(work.Theta, work.PersonWeight, Derivatives.Gradient));
        var goal = (work.Made.Shape.Name, work.Made.IsRounded) switch
        {
            ("S", _) => Goal.AtLeast(15),
            (_, true) => Goal.AtLeast(18),
            _ => Goal.AtLeast(12),
        };
        RatioTable.Row("1", "plain scalar code / gradient pass", work.Label, times[2], times[0], goal);
        RatioTable.Row("", "scalar code tuned for speed / gradient pass", work.Label, times[1], times[0]);
        RatioTable.Row("", "readable scalar reference of the library / gradient pass", work.Label, times[3], times[0]);
        double Each(double[] seconds) => seconds.Min() * 1e9 / work.Design.Situations;
        RatioTable.Remark(
            $"ns for each situation: gradient pass {Each(times[0]):F1}; plain {Each(times[2]):F0} and tuned {Each(times[1]):F0} (dense, {yardstick.Bytes / 1e6:#,0} MB each); "
            + $"readable reference {Each(times[3]):F0}");
    }

    /// <summary>The gradient pass against a plain read of the bytes it reads.</summary>
    public static void Stream(CaseAtWork work)
    {
        var read = new StreamRead(work.Design);
        var sum = 0L;
        var times = Measurement.OfThread(Repetitions, () => work.GradientPass(), () => sum += read.Run());
        // Coded columns are read so much faster than a likelihood can be computed that reading is no measure of it.
        var goal = work.Made is { Shape.Name: "L", IsRounded: false } ? Goal.AtMost(1.6) : null;
        RatioTable.Row("2", "gradient pass / plain read of the same bytes", work.Label, times[0], times[1], goal);
        RatioTable.Remark(
            $"{read.Bytes / 1e6:#,0.0} MB, {read.Bytes / (double)work.Design.Situations:F0} bytes for each situation, read at {read.Bytes / times[1].Min() / 1e9:F1} GB/s "
            + $"(sum {sum & 0xff:x2})");
    }

    /// <summary>Gradient and exact Hessian, the value alone and the information of each person, against the gradient pass.</summary>
    public static void Hessian(CaseAtWork work)
    {
        var times = Measurement.OfThread(
            Repetitions,
            () => work.GradientPass(),
            () => work.Likelihood.Evaluate(work.Theta, work.PersonWeight, Derivatives.Hessian),
            () => work.Likelihood.Evaluate(work.Theta, work.PersonWeight, Derivatives.None),
            () => work.Likelihood.PersonInformation(work.Theta));
        var goal = work.Made.Shape.Name == "S" ? null : Goal.AtMost(3.5);
        RatioTable.Row("3", "gradient and exact Hessian / gradient pass", work.Label, times[1], times[0], goal);
        RatioTable.Row("", "value alone / gradient pass", work.Label, times[2], times[0]);
        RatioTable.Row("", "information of all persons / gradient pass", work.Label, times[3], times[0]);
    }

    /// <summary>Two threads against one, by the wall clock; the same bits always.</summary>
    public static void Threads(CaseAtWork work)
    {
        var two = new VectorNestedLogit(work.Design, CommuteCase.Form, 2);
        foreach (var derivatives in Enum.GetValues<Derivatives>())
        {
            var one = work.Likelihood.Evaluate(work.Theta, work.PersonWeight, derivatives);
            var other = two.Evaluate(work.Theta, work.PersonWeight, derivatives);
            Agreement.SameBits(
                $"{work.Label}: one and two threads, {derivatives}", [one.Value, .. one.Gradient, .. one.Hessian], [other.Value, .. other.Gradient, .. other.Hessian]);
        }

        var times = Measurement.OfWall(
            Repetitions, () => work.GradientPass(), () => two.Evaluate(work.Theta, work.PersonWeight, Derivatives.Gradient));
        RatioTable.Row("8", "1 thread / 2 threads, gradient pass, wall time (needs two idle cores)", work.Label, times[0], times[1], work.Made.Shape.Name == "M" ? Goal.AtLeast(1.8) : null);
        RatioTable.Remark("value, gradient and Hessian have the same bits with one and two threads");
    }
}
