using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Design;
using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Tests.Reference;

/// <summary>
/// The published nested logit of the travel-mode data puts income at the branch. In our model income stands in air's own utility, which
/// enters the branch multiplied by the nest's l; so the published coefficient is c = b l, and its covariances follow by the delta method
/// with dc/db = l and dc/dl = b. The jackknife is not a matter of derivatives: c is formed again in every refit.
/// </summary>
internal sealed class BranchIncome
{
    private readonly PipelineRun run;
    private readonly int income;
    private readonly int fly;
    private readonly double b;
    private readonly double l;

    public BranchIncome(PipelineRun run)
    {
        this.run = run;
        var free = run.Model.Layout.Free.Select(k => run.Model.Layout.Parameters[k]).ToList();
        income = free.FindIndex(p => p.Name == "hinc_air");
        fly = free.FindIndex(p => p.Kind == ParameterKind.Dissimilarity && p.Name == "fly");
        b = run.Model.Parameters[run.Model.Layout.Free[income]];
        l = run.Model.Parameters[run.Model.Layout.Free[fly]];
    }

    /// <summary>The coefficient at the branch and its standard error.</summary>
    public (double Value, double Error) Figures(CovarianceKind kind) => (b * l, Math.Sqrt(Covariance(kind)[income, income]));

    /// <summary>F x F covariance with the coefficient at the branch in the place of ours.</summary>
    public Matrix<double> Covariance(CovarianceKind kind)
    {
        var ours = run.Inference.Covariances[kind].Matrix!;
        if (kind == CovarianceKind.Jackknife) return JackknifeAtBranch();
        var jacobian = Matrix<double>.Build.DenseIdentity(ours.RowCount);
        jacobian[income, income] = l;
        jacobian[income, fly] = b;
        return jacobian * ours * jacobian.Transpose();
    }

    private Matrix<double> JackknifeAtBranch()
    {
        var summary = run.Inference.Jackknife!;
        Xunit.Assert.Equal((JackknifeKind.Refit, 0), (summary.Kind, summary.Failures));
        var count = run.Model.Layout.Free.Length;
        var deviations = Matrix<double>.Build.DenseOfRowMajor(summary.Refits, count, summary.Deviations);
        for (var g = 0; g < summary.Refits; g++)
            deviations[g, income] = ((b + deviations[g, income]) * (l + deviations[g, fly])) - (b * l);
        return deviations.TransposeThisAndMultiply(deviations) * ((summary.Refits - 1.0) / summary.Refits);
    }
}
