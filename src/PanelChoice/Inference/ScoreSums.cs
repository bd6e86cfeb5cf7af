using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Estimation;

namespace PanelChoice.Inference;

/// <summary>All that the covariance estimators need of the scores: sums, so that the scores of a large panel never stand in memory side by side.</summary>
/// <param name="OuterProduct">F x F: sum of s_it s_it' over the contributions.</param>
/// <param name="ByCluster">G x F: sum of the scores of each cluster, row by row.</param>
public sealed record ScoreSums(ImmutableArray<double> OuterProduct, ImmutableArray<double> ByCluster)
{
    /// <summary>The sums of scores that stand in memory.</summary>
    /// <param name="scores">N x F derivatives of the weighted contributions, row by row.</param>
    /// <param name="clusterOf">Cluster of each contribution, 0 to G - 1.</param>
    /// <param name="clusters">G.</param>
    /// <param name="threads">Threads, 1 or more; no bit depends on it.</param>
    /// <exception cref="ArgumentException">The lengths do not fit together.</exception>
    public static ScoreSums Of(ReadOnlyMemory<double> scores, ImmutableArray<int> clusterOf, int clusters, int threads)
    {
        var f = clusterOf.IsEmpty ? 0 : scores.Length / clusterOf.Length;
        if (f * clusterOf.Length != scores.Length) throw new ArgumentException("Scores and clusters do not belong to the same contributions.", nameof(scores));
        var byCluster = new double[clusters * f];
        for (var i = 0; i < clusterOf.Length; i++)
            for (var k = 0; k < f; k++) byCluster[(clusterOf[i] * f) + k] += scores.Span[(i * f) + k];
        return Of(Sandwich.OuterSum(scores, f, threads), byCluster);
    }

    /// <summary>The sums of a fitted model, under its sampling weights. No bit depends on the threads of its likelihood.</summary>
    /// <param name="model">The model.</param>
    internal static ScoreSums Of(FittedModel model)
    {
        var design = model.Design;
        var sums = model.Likelihood.SumScores(model.Parameters.AsSpan(), design.PersonWeight.AsSpan());
        var k = model.Layout.Count;
        var free = model.Layout.Free;
        var f = free.Length;
        var byCluster = new double[design.Clusters.Length * f];
        for (var p = 0; p < design.Persons; p++)
            for (var i = 0; i < f; i++) byCluster[(design.ClusterOf[p] * f) + i] += sums.ByPerson[(p * k) + free[i]];
        return Of([.. free.SelectMany(r => free.Select(c => sums.Products[(r * k) + c]))], byCluster);
    }

    private static ScoreSums Of(double[] outerProduct, double[] byCluster) =>
        new(ImmutableCollectionsMarshal.AsImmutableArray(outerProduct), ImmutableCollectionsMarshal.AsImmutableArray(byCluster));
}
