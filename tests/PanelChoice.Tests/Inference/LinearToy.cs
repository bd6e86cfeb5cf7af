using System.Collections.Immutable;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;

namespace PanelChoice.Tests.Inference;

/// <summary>
/// A linear regression with normal errors of known variance 1: log-likelihood -1/2 sum w (y - x'b)^2, score w x e, information sum w x x'.
/// Every covariance has a closed form, and a second likelihood goes through the same record.
/// </summary>
internal sealed class LinearToy : IRefitter
{
    public LinearToy(int seed, int clusters, Func<int, int> sizeOf, int columns = 3)
    {
        var random = new CounterRandom(seed, "linear toy", 0);
        ClusterOf = [.. Enumerable.Range(0, clusters).SelectMany(g => Enumerable.Repeat(g, sizeOf(g)))];
        var n = ClusterOf.Length;
        X = Matrix<double>.Build.Dense(n, columns, (_, c) => c == 0 ? 1 : MathNet.Numerics.Distributions.Normal.Sample(random, 0, 1));
        var common = Enumerable.Range(0, clusters).Select(_ => MathNet.Numerics.Distributions.Normal.Sample(random, 0, 0.7)).ToArray();
        Y = Vector<double>.Build.Dense(n, i => 1 + X[i, columns - 1] + common[ClusterOf[i]] + MathNet.Numerics.Distributions.Normal.Sample(random, 0, 1));
        Clusters = clusters;
    }

    public int Clusters { get; }

    public ImmutableArray<int> ClusterOf { get; }

    public Matrix<double> X { get; }

    public Vector<double> Y { get; }

    public Vector<double> Estimate(Func<int, double> clusterWeight)
    {
        var w = Vector<double>.Build.Dense(Y.Count, i => clusterWeight(ClusterOf[i]));
        var xw = Matrix<double>.Build.DenseOfColumns(X.EnumerateColumns().Select(c => c.PointwiseMultiply(w)));
        return (xw.Transpose() * X).Solve(xw.Transpose() * Y);
    }

    public InferenceInput Input()
    {
        var b = Estimate(_ => 1);
        var e = Y - (X * b);
        var f = X.ColumnCount;
        return new InferenceInput(
            [.. b], [.. Enumerable.Range(0, f).Select(k => $"x{k}")], [.. Enumerable.Repeat(ParameterKind.Coefficient, f)],
            [.. Enumerable.Range(0, f)], [.. Enumerable.Repeat(new NullValue(0, null, null), f)], ContributionKind.Occasion,
            Y.Count,
            threads => ScoreSums.Of(
                Enumerable.Range(0, Y.Count).SelectMany(i => Enumerable.Range(0, f).Select(k => X[i, k] * e[i])).ToArray(), ClusterOf, Clusters, threads),
            [.. (X.Transpose() * X).ToRowMajorArray()],
            (first, count) => [.. Enumerable.Range(first, count).SelectMany(g => (Rows(g).Transpose() * Rows(g)).ToRowMajorArray())],
            "person", [.. Enumerable.Range(1, Clusters).Select(g => $"{g}")],
            [.. Enumerable.Range(0, Clusters).Select(g => ClusterOf.Count(c => c == g))], false, 1, null, this);
    }

    public Matrix<double> Rows(int cluster) =>
        Matrix<double>.Build.DenseOfRowVectors(Enumerable.Range(0, Y.Count).Where(i => ClusterOf[i] == cluster).Select(i => X.Row(i)));

    public ImmutableArray<RefitOutcome> Refit(ImmutableArray<RefitRequest> batch, CancellationToken cancellation) =>
        [.. batch.Select(r => new RefitOutcome(FitStatus.Converged, [.. Estimate(g => r.ClusterWeight[g])], 0, 1, false, null, []) { Decrement = 0 })];
}
