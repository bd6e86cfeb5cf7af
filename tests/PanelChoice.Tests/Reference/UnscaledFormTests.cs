using PanelChoice.Estimation;
using PanelChoice.Inference;
using Xunit;

namespace PanelChoice.Tests.Reference;

/// <summary>
/// The unscaled form on the travel-mode data against an independent program that has income at the branch (scripts beside the fixtures;
/// the model is that of Greene, Econometric Analysis, 5th ed. 2003, table 21.12).
/// </summary>
public class UnscaledFormTests
{
    private const string Name = "b2_modechoice_nested_greene";

    public static TheoryData<CovarianceKind> Kinds => [.. ReferenceCase.CovarianceKinds];

    [Fact]
    public void Log_likelihood_and_coefficients_agree()
    {
        var (expected, run) = (ReferenceCase.Read(Name), PipelineRun.Of(Name));
        Assert.Equal(FitStatus.Converged, run.Model.Status);
        var likelihood = new Agreement(Agreement.LogLikelihood);
        likelihood.Compare("log-likelihood", expected.LogLikelihood, run.Model.LogLikelihood);
        likelihood.AssertAll(1);

        var coefficients = new Agreement(Agreement.Coefficient);
        var places = run.Sample.PlacesIn(expected);
        for (var f = 0; f < places.Length; f++)
        {
            var parameter = expected.Parameters[places[f]];
            var value = run.Model.Parameters[run.Model.Layout.Free[f]];
            if (parameter == "hinc_air")
            {
                coefficients.Compare("income in air's utility", expected.Coefficient("hinc_air") / expected.Coefficient("tau_fly"), value);
                value = new BranchIncome(run).Figures(CovarianceKind.Pooled).Value;
            }

            coefficients.Compare(parameter, expected.Coefficient(parameter), value);
        }

        coefficients.AssertAll(expected.Parameters.Length + 1);
    }

    [Theory]
    [MemberData(nameof(Kinds))]
    public void Covariances_agree_with_income_at_the_branch(CovarianceKind kind)
    {
        var (expected, run) = (ReferenceCase.Read(Name), PipelineRun.Of(Name));
        var places = run.Sample.PlacesIn(expected);
        var (ours, target) = (new BranchIncome(run).Covariance(kind), expected.Covariance(kind));
        var agreement = new Agreement(Agreement.OtherProgram);
        for (var r = 0; r < places.Length; r++)
        {
            agreement.Compare(
                $"standard error of {expected.Parameters[places[r]]}", expected.StandardError(kind, expected.Parameters[places[r]]), Math.Sqrt(ours[r, r]));
            for (var c = 0; c < places.Length; c++)
                agreement.Compare($"covariance of {expected.Parameters[places[r]]} and {expected.Parameters[places[c]]}", target[places[r], places[c]], ours[r, c]);
        }

        agreement.AssertAll(places.Length * (places.Length + 1));
    }
}
