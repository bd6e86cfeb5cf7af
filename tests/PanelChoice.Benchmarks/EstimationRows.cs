using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>A fit, its covariances and its refits, counted in passes of the same case on the same thread.</summary>
internal static class EstimationRows
{
    private const int Repetitions = 8;
    private const int RepetitionsOfReplicates = 3;
    private const int Replicates = 100;

    private static readonly InferenceSettings Analytic = new("person", 0.95, JackknifeKind.Off, 0, 7);

    /// <summary>A cold fit from one start.</summary>
    public static void Fit(CaseAtWork work)
    {
        var fitted = work.Model;
        var times = Measurement.OfThread(Repetitions, () => work.GradientPass(), () => fitted = work.ColdFit());
        var decrement = Decrement(work);
        RatioTable.Row(
            "4", "cold fit, one start / gradient pass", work.Label, times[1], times[0], work.Made.Shape.Name == "S" ? Goal.AtMost(55) : Goal.AtMost(22));
        RatioTable.Remark($"{fitted.Status}, log-likelihood {fitted.LogLikelihood:F6}, Newton decrement {decrement:E1}");
        WhereItGoes(work, times[0].Min());
        Agreement.Holds(fitted.Status == FitStatus.Converged && decrement < 1e-9, $"{work.Label}: the fit ended as {fitted.Status} with decrement {decrement:E1}");
    }

    /// <summary>Every analytic covariance of a fitted model.</summary>
    public static void Covariances(CaseAtWork work)
    {
        var refitter = new ClusterRefitter(work.Model, 1);
        InferenceResult? result = null;
        var times = Measurement.OfThread(
            Repetitions,
            () => work.GradientPass(),
            () => result = StandardErrors.Compute(InferenceInput.From(work.Model, refitter), Analytic, WorkContext.Quiet),
            () => work.Likelihood.SumScores(work.Theta, work.PersonWeight));
        RatioTable.Row("5", "all analytic covariances after the fit / gradient pass", work.Label, times[1], times[0], Goal.AtMost(3));
        RatioTable.Row("", "of which the pass that sums scores by person, and their products", work.Label, times[2], times[0]);
        CovarianceKind[] kinds = [CovarianceKind.Pooled, CovarianceKind.OuterProduct, CovarianceKind.Robust, CovarianceKind.Cluster, CovarianceKind.ClusterUncorrected];
        foreach (var kind in kinds)
            Agreement.Holds(result!.Covariances[kind].Matrix is not null, $"{work.Label}: {kind} was refused");
    }

    /// <summary>A bootstrap of full refits.</summary>
    public static void Bootstrap(CaseAtWork work)
    {
        var input = InferenceInput.From(work.Model, new ClusterRefitter(work.Model, 1));
        var draw = ClusterDraw.Weights(7, 0, work.Design.Clusters.Length).ToArray();
        BootstrapSummary? summary = null;
        var settings = Analytic with { Replicates = Replicates };
        var times = Measurement.OfThread(
            RepetitionsOfReplicates,
            () => work.Likelihood.Evaluate(work.Theta, draw, Derivatives.Gradient),
            () => summary = ClusterBootstrap.Estimate(Fresh(work, input), settings, WorkContext.Quiet).Summary);
        var goal = work.Made.Shape.Name switch { "S" => Goal.AtMost(1200), "M" => Goal.AtMost(200), _ => null };
        RatioTable.Row("6", $"{Replicates}-replicate bootstrap of full refits / separate weighted gradient pass", work.Label, times[1], times[0], goal);
        Agreement.Holds(summary!.Done == Replicates, $"{work.Label}: {summary.Done} of {Replicates} replicates converged");
        Farthest(work, input, summary);
    }

    /// <summary>A jackknife of full refits.</summary>
    public static void Jackknife(CaseAtWork work)
    {
        var input = InferenceInput.From(work.Model, new ClusterRefitter(work.Model, 1));
        var sums = input.Scores(1);
        JackknifeSummary? summary = null;
        var times = Measurement.OfThread(
            RepetitionsOfReplicates,
            () => work.GradientPass(),
            () => summary = ClusterJackknife.Estimate(Fresh(work, input), sums, JackknifeKind.Refit, WorkContext.Quiet).Summary);
        RatioTable.Row("7", $"jackknife over {work.Design.Clusters.Length} persons, full refits / gradient pass", work.Label, times[1], times[0], Goal.AtMost(6000));
        Agreement.Holds(summary!.Failures == 0, $"{work.Label}: {summary.Failures} refits of the jackknife failed");
    }

    /// <summary>The parts of one fit, in gradient passes.</summary>
    private static void WhereItGoes(CaseAtWork work, double pass)
    {
        var watched = new WatchedLikelihood(work.Likelihood);
        var all = Seconds(() => CaseAtWork.ColdFit(watched));
        var survey = Seconds(() => ColumnSurvey.Of(work.Design, 1));
        var reference = Seconds(() => ReferenceFits.Of(work.Design, work.PersonWeight).Constants());
        var rest = all - survey - reference - watched.Asked.Values.Sum(a => a.Seconds);
        var passes = watched.Asked.Select(a => $"{a.Value.Calls} x {a.Key} {a.Value.Seconds / pass:F1}");
        RatioTable.Remark(
            $"in gradient passes: {string.Join(", ", passes)}, survey of columns {survey / pass:F1}, likelihoods to compare with {reference / pass:F1}, "
            + $"all else {rest / pass:F1}");

        static double Seconds(Action action)
        {
            var from = ThreadClock.Seconds();
            action();
            return ThreadClock.Seconds() - from;
        }
    }

    /// <summary>With a refitter that has learnt nothing yet, so that the pass before the first replicate counts.</summary>
    private static InferenceInput Fresh(CaseAtWork work, InferenceInput input) => input with { Refitter = new ClusterRefitter(work.Model, 1) };

    /// <summary>How far replicates end from their optimum, in standard errors: the Newton decrement, evaluated anew.</summary>
    private static void Farthest(CaseAtWork work, InferenceInput input, BootstrapSummary summary)
    {
        const int Checked = 5;
        var K = input.Estimates.Length;
        var farthest = 0.0;
        for (var r = 0; r < Checked; r++)
        {
            double[] weight = [.. ClusterDraw.Weights(7, r, work.Design.Clusters.Length)];
            var at = work.Likelihood.Evaluate(summary.Estimates.AsSpan().Slice(r * K, K), weight, Derivatives.Hessian);
            farthest = Math.Max(farthest, Decrement(at));
        }

        RatioTable.Remark($"Newton decrement of the first {Checked} replicates, evaluated anew: at most {farthest:E1} standard errors");
        Agreement.Holds(farthest < 1e-5, $"{work.Label}: a replicate ended {farthest:E1} standard errors from its optimum");
    }

    private static double Decrement(CaseAtWork work) =>
        Decrement(work.Likelihood.Evaluate(work.Model.Parameters.AsSpan(), work.PersonWeight, Derivatives.Hessian));

    private static double Decrement(LikelihoodEvaluation at)
    {
        var K = at.Gradient.Length;
        double[] information = [.. at.Hessian.Select(h => -h)];
        if (ScaledCholesky.Factor(information, K, out _) is not { } factor) return double.PositiveInfinity;
        double[] step = [.. at.Gradient];
        factor.Solve(step);
        return Math.Sqrt(step.Zip(at.Gradient, (s, g) => s * g).Sum());
    }
}
