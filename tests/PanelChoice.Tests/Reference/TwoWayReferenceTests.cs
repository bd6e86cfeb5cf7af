using PanelChoice.Inference;
using Xunit;

namespace PanelChoice.Tests.Reference;

/// <summary>Clustered by person and date on the reference cases, with G/(G-1) in each component.</summary>
public class TwoWayReferenceTests
{
    public static TheoryData<string> Cases => ReferenceCase.TwoWay;

    [Theory]
    [MemberData(nameof(Cases))]
    public void Clustered_two_ways_agrees_and_a_negative_variance_is_no_standard_error(string name)
    {
        var (expected, run) = (ReferenceCase.Read(name), PipelineRun.Of(name));
        var agreement = new Agreement(Agreement.OtherProgram);
        var errors = run.StandardErrors(CovarianceKind.TwoWay, expected);
        var negative = expected.NegativeTwoWay;
        var estimate = run.Inference.Covariances[CovarianceKind.TwoWay];
        for (var r = 0; r < expected.Parameters.Length; r++)
        {
            if (negative.Contains(expected.Parameters[r])) Assert.Equal(double.NaN, errors[r]);
            else agreement.Compare(expected.Parameters[r], expected.StandardError(CovarianceKind.TwoWay, expected.Parameters[r]), errors[r]);
        }

        Assert.Equal(negative.Length, run.Inference.TwoWay!.Negative.Length);
        Assert.Equal(negative.Length, estimate.RefusedParameters.Length);
        if (negative.Length > 0) Assert.True(run.Inference.TwoWay.Repaired);
        if (!run.Inference.TwoWay.Repaired)
        {
            var (matrix, target) = (run.Covariance(CovarianceKind.TwoWay, expected), expected.Covariance(CovarianceKind.TwoWay));
            for (var r = 0; r < expected.Parameters.Length; r++)
                for (var c = 0; c < expected.Parameters.Length; c++) agreement.Compare($"{r}, {c}", target[r, c], matrix[r, c]);
        }

        agreement.AssertAll(expected.Parameters.Length - negative.Length);
    }
}
