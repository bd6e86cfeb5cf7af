using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Tests.Inference;

/// <summary>
/// A second, plain way to the maximum: damped Newton in the user's units on the reference likelihood. Tests of the covariance estimators
/// rest on it, so that they do not lean on the estimation they are run with.
/// </summary>
internal sealed class NewtonRefitter(IChoiceLikelihood likelihood, int threads) : IRefitter
{
    public static (FittedModel Model, NewtonRefitter Refitter) Fit(ChoiceDesign design, double[] start, int threads = 1)
    {
        var likelihood = new ScalarNestedLogit(design, NestedLogitForm.UtilityScaled, 1);
        var refitter = new NewtonRefitter(likelihood, threads);
        var outcome = refitter.Maximise([.. Enumerable.Repeat(1.0, design.Clusters.Length)], start, []);
        Xunit.Assert.True(outcome.Status == FitStatus.Converged, outcome.FailureKind);
        var hessian = likelihood.Evaluate(outcome.Parameters.AsSpan(), design.PersonWeight.AsSpan(), Derivatives.Hessian).Hessian;
        var model = new FittedModel(
            likelihood, NestedLogitForm.UtilityScaled, FitStatus.Converged, outcome.Parameters, outcome.LogLikelihood, 0, null, hessian, 0,
            outcome.Iterations, 1, 1, [], []);
        return (model, refitter);
    }

    public ImmutableArray<RefitOutcome> Refit(ImmutableArray<RefitRequest> batch, CancellationToken cancellation)
    {
        var outcomes = new RefitOutcome[batch.Length];
        Parallel.For(0, batch.Length, new ParallelOptions { MaxDegreeOfParallelism = threads, CancellationToken = cancellation },
            i => outcomes[i] = Maximise(batch[i].ClusterWeight, batch[i].Start.AsSpan(), batch[i].Held));
        return [.. outcomes];
    }

    private RefitOutcome Maximise(ImmutableArray<double> clusterWeight, ReadOnlySpan<double> start, ImmutableArray<int> held)
    {
        var design = likelihood.Design;
        var k = design.Layout.Count;
        var free = design.Layout.Free.Where(p => !held.Contains(p)).ToArray();
        var f = free.Length;
        var weight = Enumerable.Range(0, design.Persons).Select(p => design.PersonWeight[p] * clusterWeight[design.ClusterOf[p]]).ToArray();
        var at = start.ToArray();
        var here = likelihood.Evaluate(at, weight, Derivatives.Hessian);
        RefitOutcome Failed(FitStatus status, string kind, params int[] about) => new(status, [.. at], here.Value, 0, false, kind, [.. about]);
        for (var iteration = 0; iteration < 60; iteration++)
        {
            var information = new double[f * f];
            for (var r = 0; r < f; r++)
                for (var c = 0; c < f; c++) information[(r * f) + c] = -here.Hessian[(free[r] * k) + free[c]];
            for (var r = 0; r < f; r++)
                if (information[(r * f) + r] == 0) return Failed(FitStatus.NotIdentified, "not identified", free[r]);
            var step = free.Select(p => here.Gradient[p]).ToArray();
            var slope = (double[])step.Clone();
            var ridge = 0.0;
            ScaledCholesky? factor;
            while ((factor = ScaledCholesky.Factor(information, f, out _)) is null)
            {
                ridge = Math.Max(1e-3, 10 * ridge);
                for (var r = 0; r < f; r++) information[(r * f) + r] = Math.Abs(information[(r * f) + r]) * (1 + ridge);
            }

            factor.Solve(step);
            var decrement = step.Zip(slope, (s, g) => s * g).Sum();
            var size = 1.0;
            var next = here;
            for (; size > 1e-10; size /= 2)
            {
                var trial = (double[])at.Clone();
                for (var r = 0; r < f; r++) trial[free[r]] += size * step[r];
                if (Enumerable.Range(design.Layout.Coefficients, k - design.Layout.Coefficients).Any(p => trial[p] <= 0.01)) continue;
                next = likelihood.Evaluate(trial, weight, Derivatives.Hessian);
                if (next.Value >= here.Value - (1e-12 * Math.Abs(here.Value)))
                {
                    at = trial;
                    break;
                }
            }

            here = next;
            var far = free.FirstOrDefault(p => Math.Abs(at[p]) > 15, -1);
            if (far >= 0) return Failed(FitStatus.Separated, "separated", far);
            if (ridge == 0 && size == 1 && decrement < 1e-16) return new RefitOutcome(FitStatus.Converged, [.. at], here.Value, iteration, false, null, []) { Decrement = Math.Sqrt(Math.Max(0, decrement)) };
        }

        return Failed(FitStatus.Stopped, "not converged");
    }
}
