using PanelChoice.Estimation;
using PanelChoice.Inference;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

/// <summary>Sums of scores made strip by strip against those of scores that stand in memory.</summary>
public class ScoreSumsTests
{
    [Theory]
    [InlineData(40, 7)]
    [InlineData(3, 300)]
    [InlineData(2, 40)]
    public void Strip_by_strip_gives_the_sums_of_all_scores_at_once(int persons, int occasions)
    {
        var made = Small(91, persons, occasions).Weighted(p => 1 + (0.3 * (p % 3)));
        foreach (var panel in new[] { made, made.Clustered("household", p => (p * 5) % Math.Max(1, (persons + 1) / 2)) })
        {
            var design = panel.Design();
            var (model, _) = NewtonRefitter.Fit(design, design.PlainStart());
            var whole = ScoreSums.Of(
                WeightedScores(model), [.. Enumerable.Range(0, design.Situations).Select(s => design.ClusterOf[design.PersonOf[s]])], design.Clusters.Length, 1);
            var streamed = ScoreSums.Of(model);
            Assert.InRange(Likelihood.Kernels.Distance(whole.OuterProduct, streamed.OuterProduct), 0, 1e-12);
            // At the maximum the scores cancel: their sums are compared with what was added up.
            var size = whole.OuterProduct.Max(Math.Abs);
            Assert.All(whole.ByCluster.Zip(streamed.ByCluster), x => Assert.InRange(Math.Abs(x.First - x.Second), 0, 1e-12 * size));
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
