using System.Collections.Immutable;
using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>
/// Delete-one-cluster estimates by one Newton step from the full estimate, th_(g) = th - (H - H_g)^-1 s_g, H_g the cluster's part of H and s_g its score
/// (MacKinnon, Nielsen and Webb 2024 give it for the logit).
/// </summary>
/// <param name="Deviations">G x F: th_(g) - th; NaN where H - H_g is not positive definite.</param>
/// <param name="Failures">These clusters, with the place of the term in which it fails.</param>
internal sealed record OneStepDeletions(double[] Deviations, ImmutableArray<(int Cluster, int Term)> Failures)
{
    /// <summary>The steps.</summary>
    public static OneStepDeletions Of(InferenceInput input, ImmutableArray<double> scores, WorkContext work)
    {
        var clusters = input.Clusters.Length;
        var f = input.Free.Length;
        ImmutableArray<double> parts = [];
        var deviations = new double[clusters * f];
        var failures = ImmutableArray.CreateBuilder<(int, int)>();
        var without = new double[f * f];
        for (var g = 0; g < clusters; g++)
        {
            if (g % ClusterJackknife.ClustersAtOnce == 0)
            {
                work.Report("jackknife", g, clusters);
                parts = input.ClusterInformation(g, Math.Min(ClusterJackknife.ClustersAtOnce, clusters - g));
            }

            for (var i = 0; i < without.Length; i++) without[i] = input.Information[i] - parts[(g % ClusterJackknife.ClustersAtOnce * f * f) + i];
            var row = deviations.AsSpan(g * f, f);
            if (ScaledCholesky.Factor(without, f, out var failed) is not { } factor)
            {
                failures.Add((g, failed));
                row.Fill(double.NaN);
                continue;
            }

            for (var k = 0; k < f; k++) row[k] = -scores[(g * f) + k];
            factor.Solve(row);
        }

        work.Report("jackknife", clusters, clusters);
        return new OneStepDeletions(deviations, failures.ToImmutable());
    }
}
