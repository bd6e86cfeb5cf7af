using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

/// <summary>The covariance estimators on the project's own estimation and refits, against the plain Newton of these tests.</summary>
public class FittedModelInferenceTests
{
    [Fact]
    public void Standard_errors_agree_with_those_of_a_second_way_to_the_maximum()
    {
        var made = Small(81, 25, 8).Weighted(p => 1 + (0.5 * (p % 3)));
        var design = made.Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var second = StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(JackknifeKind.Refit, 20), WorkContext.Quiet);
        var first = Compute(made, Settings(JackknifeKind.Refit, 20), 1);
        Assert.Equal((20, 20), (first.Bootstrap!.Done, second.Bootstrap!.Done));
        foreach (var (a, b) in first.Parameters.Zip(second.Parameters))
            foreach (var kind in a.ByKind.Keys.Where(k => k != CovarianceKind.TwoWay))
                Assert.InRange(a.ByKind[kind].StandardError!.Value / b.ByKind[kind].StandardError!.Value, 1 - 1e-8, 1 + 1e-8);
    }

    [Fact]
    public void Threads_change_no_bit()
    {
        var made = Small(82, 20, 6);
        var one = Compute(made, Settings(JackknifeKind.Refit, 30), 1);
        var two = Compute(made, Settings(JackknifeKind.Refit, 30), 2);
        Assert.Equal(one.Bootstrap!.Estimates.ToArray(), two.Bootstrap!.Estimates.ToArray());
        Assert.Equal(one.Jackknife!.Deviations.ToArray(), two.Jackknife!.Deviations.ToArray());
        foreach (var kind in one.Covariances.Keys)
            Assert.Equal(one.Covariances[kind].Matrix?.ToRowMajorArray(), two.Covariances[kind].Matrix?.ToRowMajorArray());
    }

    [Fact]
    public void A_dummy_of_two_persons_fails_where_neither_is_drawn_and_keeps_its_jackknife()
    {
        var result = Compute(Small(45, 12, 10).WithTicket(2, 3, 8), Settings(JackknifeKind.Refit, 60), 1);
        var without = Enumerable.Range(0, 60).Where(r => ClusterDraw.Weights(7, r, 12) is var w && w[3] == 0 && w[8] == 0).ToList();
        Assert.All(without, r => Assert.Equal("not identified", result.Bootstrap!.Status[r]));
        Assert.Equal(without, result.Bootstrap!.Failures.Single(f => f.Kind == "not identified").Replicates.AsEnumerable());
        Assert.Contains("not identified: 'ticket [C]'", result.Covariances[CovarianceKind.Bootstrap].Refusal, StringComparison.Ordinal);
        Assert.NotNull(result.Covariances[CovarianceKind.Jackknife].Matrix);
    }

    [Fact]
    public void A_dummy_of_one_person_has_no_jackknife_and_the_other_terms_have()
    {
        var result = Compute(Small(25, 12, 8).WithTicket(2, 4), Settings(JackknifeKind.Auto), 1);
        var covariance = result.Covariances[CovarianceKind.Jackknife];
        Assert.Contains("Without person 5 'ticket [C]'", Assert.Single(covariance.RefusedReasons), StringComparison.Ordinal);
        Assert.Equal(1, result.Parameters.Count(p => p.ByKind[CovarianceKind.Jackknife].StandardError is null));
    }

    private static InferenceResult Compute(SyntheticPanel made, InferenceSettings settings, int threads)
    {
        var work = new WorkContext(threads, null, CancellationToken.None);
        var likelihood = LikelihoodKernel.Create(made.Design(), NestedLogitForm.UtilityScaled, threads);
        var model = MaximumLikelihood.Fit(likelihood, NestedLogitForm.UtilityScaled, new EstimateSettings(NestedLogitForm.UtilityScaled, 5, 7), work);
        Assert.Equal(FitStatus.Converged, model.Status);
        return StandardErrors.Compute(InferenceInput.From(model, new ClusterRefitter(model, threads)), settings, work);
    }
}
