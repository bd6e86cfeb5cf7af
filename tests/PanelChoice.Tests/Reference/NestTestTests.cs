using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Reference;

/// <summary>
/// Tests of dissimilarities on the travel-mode data (210 travellers; Greene, Econometric Analysis, 5th ed. 2003, table F21.2). Both log-likelihoods were
/// certified in 60-digit arithmetic (fixtures/data/certified_modechoice.txt); with equal dissimilarities the unscaled form is the utility-scaled one.
/// </summary>
public class NestTestTests
{
    private const double Free = -193.656148578482, Equal = -194.943939439304;

    [Fact]
    public void Equal_dissimilarities_give_the_likelihood_ratio_of_the_two_certified_maxima()
    {
        var run = PipelineRun.Of("b2_modechoice_nested_greene");
        var nests = run.Model.Layout.Nests;
        var study = run.Sample.Study with
        {
            Tests = [new TestSpecification("equal", [.. nests.Select(n => new TestedTerm(n.Name, 1, 1))], [], true, 1)],
        };
        var input = InferenceInput.From(run.Model, new ClusterRefitter(run.Model, 1));
        var plan = TermTestPlan.Of(study, run.Sample.Covariates.Covariates, run.Model.Layout, input, study.Inference);
        var result = TermTests.Run(
            input, plan, run.Inference, new RestrictedRefitter(run.Model, CancellationToken.None), study.Inference with { ScoreDraws = 0 }, WorkContext.Quiet)[^1];
        Assert.Equal(2 * (Free - Equal), result.LikelihoodRatio.Statistic!.Value, 1e-6);
        Assert.Equal(1, result.LikelihoodRatio.Freedom);
        Assert.Equal("2.576", result.LikelihoodRatio.Statistic.Value.ToString("F3", System.Globalization.CultureInfo.InvariantCulture));
    }
}
