using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Estimation;

namespace PanelChoice.Inference;

/// <summary>
/// What failed replicates would add to the standard errors. Each enters with its last iterate; a parameter that the failure names (its last value says where a
/// search gave up, not where a maximum is) and every parameter of a replicate that could not be fitted at all, or ended in no finite number, enters with the value
/// of the converged replicate farthest from their mean.
/// </summary>
internal static class FailedReplicates
{
    /// <summary>Which failed, of what kind, and about which parameters.</summary>
    public static ImmutableArray<FailedReplicate> List(InferenceInput input, ImmutableArray<RefitOutcome> outcomes) =>
    [
        .. Enumerable.Range(0, outcomes.Length).Where(r => !HasConverged(outcomes[r], input))
            .Select(r => new FailedReplicate(r, FailureKinds.Of(outcomes[r]), [.. outcomes[r].FailedParameters.Distinct().Order()])),
    ];

    /// <summary>Whether a replicate has an estimate of every free parameter.</summary>
    public static bool HasConverged(RefitOutcome outcome, InferenceInput input) =>
        outcome.Status == FitStatus.Converged && input.Free.All(k => double.IsFinite(outcome.Parameters[k])) && double.IsFinite(outcome.LogLikelihood);

    /// <summary>Standard errors of the F free parameters with the failed replicates in; empty where fewer than two converged.</summary>
    /// <param name="input">The fit.</param>
    /// <param name="outcomes">All replicates.</param>
    /// <param name="factor">Factor of the covariance.</param>
    public static ImmutableArray<double> StandardErrors(InferenceInput input, ImmutableArray<RefitOutcome> outcomes, double factor)
    {
        var converged = outcomes.Where(o => HasConverged(o, input)).ToList();
        if (converged.Count < 2) return [];
        var errors = new double[input.Free.Length];
        for (var i = 0; i < errors.Length; i++)
        {
            var k = input.Free[i];
            var mean = converged.Average(o => o.Parameters[k] - input.Estimates[k]) + input.Estimates[k];
            var farthest = converged.Select(o => o.Parameters[k]).MaxBy(x => Math.Abs(x - mean));
            var values = outcomes.Select(o => HasConverged(o, input) || HasIterate(o, k) ? o.Parameters[k] : farthest).ToArray();
            errors[i] = Math.Sqrt(factor) * MathNet.Numerics.Statistics.ArrayStatistics.StandardDeviation(values);
        }

        return ImmutableCollectionsMarshal.AsImmutableArray(errors);
    }

    private static bool HasIterate(RefitOutcome outcome, int parameter) =>
        outcome.Iterations > 0 && parameter < outcome.Parameters.Length && double.IsFinite(outcome.Parameters[parameter])
        && !outcome.FailedParameters.Contains(parameter);
}
