using PanelChoice.Estimation;
using PanelChoice.Inference;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

/// <summary>Sums of scores made block by block against those of scores that stand in memory: the same bits.</summary>
public class ScoreSumsTests
{
    [Theory]
    [InlineData(40, 7)]
    [InlineData(3, 300)]
    [InlineData(2, 40)]
    public void Block_by_block_gives_the_bits_of_all_scores_at_once(int persons, int occasions)
    {
        var made = Small(91, persons, occasions).Weighted(p => 1 + (0.3 * (p % 3)));
        foreach (var panel in new[] { made, made.Clustered("household", p => (p * 5) % Math.Max(1, (persons + 1) / 2)) })
        {
            var design = panel.Design();
            var (model, _) = NewtonRefitter.Fit(design, design.PlainStart());
            var whole = ScoreSums.Of(
                WeightedScores(model), [.. Enumerable.Range(0, design.Situations).Select(s => design.ClusterOf[design.PersonOf[s]])], design.Clusters.Length, 1);
            foreach (var threads in new[] { 1, 2 })
            {
                var streamed = ScoreSums.Of(model, threads);
                Assert.Equal(whole.OuterProduct.AsEnumerable(), streamed.OuterProduct.AsEnumerable());
                Assert.Equal(whole.ByCluster.AsEnumerable(), streamed.ByCluster.AsEnumerable());
            }
        }
    }

    private static double[] WeightedScores(FittedModel model)
    {
        var (design, k) = (model.Design, model.Layout.Count);
        var all = model.Likelihood.Scores(model.Parameters.AsSpan());
        return [.. Enumerable.Range(0, design.Situations).SelectMany(
            s => model.Layout.Free.Select(f => design.PersonWeight[design.PersonOf[s]] * all[(s * k) + f]))];
    }
}
