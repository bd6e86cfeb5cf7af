using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Estimation;
using PanelChoice.Numerics;

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

    /// <summary>
    /// The sums of a fitted model, block by block. Each of the fixed chunks of situations adds up its own outer products, and the scores of the persons
    /// who begin in it, for whom it goes on beyond its end: where persons are the clusters, no sum has two parts. A cluster of several persons is
    /// summed by one thread, in the order of situations.
    /// </summary>
    /// <param name="model">The model.</param>
    /// <param name="threads">Threads, 1 or more; no bit depends on it.</param>
    internal static ScoreSums Of(FittedModel model, int threads)
    {
        var design = model.Design;
        var f = model.Layout.Free.Length;
        var byCluster = new double[design.Clusters.Length * f];
        var parts = new double[FixedChunks.Count(design.Situations)][];
        var isPersonByPerson = design.Clusters.Length == design.Persons;
        FixedChunks.Run(design.Situations, isPersonByPerson ? threads : 1, (chunk, first, end) =>
        {
            var outer = new double[f * f];
            var row = new double[f];
            Walk(model, first, end, (situation, person, score) =>
            {
                Weigh(score, design.PersonWeight[person], model.Layout.Free, row);
                if (situation < end) Sandwich.AddOuter(row, outer);
                var into = byCluster.AsSpan(design.ClusterOf[person] * f, f);
                if (isPersonByPerson ? design.PersonStart[person] >= first : situation < end)
                    for (var k = 0; k < f; k++) into[k] += row[k];
            });
            parts[chunk] = outer;
        });
        return Of(Sandwich.Total(parts, f), byCluster);
    }

    private delegate void ScoreVisitor(int situation, int person, ReadOnlySpan<double> score);

    /// <summary>Visits the scores from a situation on to the end of the person who has the last one before <paramref name="end"/>.</summary>
    private static void Walk(FittedModel model, int first, int end, ScoreVisitor visit)
    {
        var design = model.Design;
        if (first == end) return;
        var k = model.Layout.Count;
        var person = design.PersonOf[first];
        var last = design.PersonStart[design.PersonOf[end - 1] + 1];
        var scores = Array.Empty<double>();
        for (var b = design.BlockOf[first]; b < design.Blocks.Length && design.Blocks[b].FirstSituation < last; b++)
        {
            var block = design.Blocks[b];
            if (scores.Length < block.Situations * k) scores = new double[block.Situations * k];
            model.Likelihood.Scores(model.Parameters.AsSpan(), block, scores);
            for (var s = Math.Max(first, block.FirstSituation); s < Math.Min(last, block.FirstSituation + block.Situations); s++)
            {
                if (s == design.PersonStart[person + 1]) person++;
                visit(s, person, scores.AsSpan((s - block.FirstSituation) * k, k));
            }
        }
    }

    private static void Weigh(ReadOnlySpan<double> score, double weight, ImmutableArray<int> free, double[] row)
    {
        for (var i = 0; i < row.Length; i++) row[i] = weight * score[free[i]];
    }

    private static ScoreSums Of(double[] outerProduct, double[] byCluster) =>
        new(ImmutableCollectionsMarshal.AsImmutableArray(outerProduct), ImmutableCollectionsMarshal.AsImmutableArray(byCluster));
}
