using PanelChoice.Estimation;
using PanelChoice.Inference;
using Xunit;

namespace PanelChoice.Tests.Reference;

/// <summary>
/// The whole pipeline on raw columns against an independent program (plain arrays, 80-bit arithmetic; scripts beside the fixtures), whose
/// values agree with general-purpose statistics libraries (fixtures/AGREEMENT.md).
/// </summary>
public class PipelineTests
{
    public static TheoryData<string> Cases => ReferenceCase.Described;

    public static TheoryData<string, CovarianceKind> CasesAndKinds
    {
        get
        {
            var all = new TheoryData<string, CovarianceKind>();
            foreach (var name in ReferenceCase.DescribedNames)
                foreach (var kind in ReferenceCase.CovarianceKinds) all.Add(name, kind);
            return all;
        }
    }

    [Theory]
    [MemberData(nameof(Cases))]
    public void The_maximum_is_found_and_its_log_likelihoods_agree(string name)
    {
        var (expected, run) = (ReferenceCase.Read(name), PipelineRun.Of(name));
        Assert.Equal(FitStatus.Converged, run.Model.Status);
        var agreement = new Agreement(Agreement.LogLikelihood);
        agreement.Compare("log-likelihood", expected.LogLikelihood, run.Model.LogLikelihood);
        agreement.Compare("with equal probabilities", expected.LogLikelihoodEqualProbability, run.Model.LogLikelihoodEqualProbability);
        agreement.AssertAll(2);
    }

    [Theory]
    [MemberData(nameof(Cases))]
    public void Coefficients_agree(string name)
    {
        var (expected, run) = (ReferenceCase.Read(name), PipelineRun.Of(name));
        var agreement = new Agreement(Agreement.Coefficient);
        var places = run.Sample.PlacesIn(expected);
        for (var f = 0; f < places.Length; f++)
        {
            var parameter = expected.Parameters[places[f]];
            agreement.Compare(parameter, expected.Coefficient(parameter), run.Model.Parameters[run.Model.Layout.Free[f]]);
        }

        agreement.AssertAll(expected.Parameters.Length);
    }

    [Theory]
    [MemberData(nameof(CasesAndKinds))]
    public void Standard_errors_and_covariances_agree(string name, CovarianceKind kind)
    {
        var (expected, run) = (ReferenceCase.Read(name), PipelineRun.Of(name));
        var agreement = new Agreement(Agreement.OtherProgram);
        var errors = run.StandardErrors(kind, expected);
        var (matrix, target) = (run.Covariance(kind, expected), expected.Covariance(kind));
        for (var r = 0; r < expected.Parameters.Length; r++)
        {
            agreement.Compare($"standard error of {expected.Parameters[r]}", expected.StandardError(kind, expected.Parameters[r]), errors[r]);
            for (var c = 0; c < expected.Parameters.Length; c++)
                agreement.Compare($"covariance of {expected.Parameters[r]} and {expected.Parameters[c]}", target[r, c], matrix[r, c]);
        }

        agreement.AssertAll(expected.Parameters.Length * (expected.Parameters.Length + 1));
    }
}
