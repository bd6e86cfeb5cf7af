using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>Spreads covariances of the free parameters over the result's whole parameter list.</summary>
internal static class CovarianceExpansion
{
    public static CovarianceMatrices Over(ImmutableArray<ParameterEntry> entries, InferenceResult inference, ReasonBook book)
    {
        return new CovarianceMatrices(
            Full(CovarianceKind.Pooled), Full(CovarianceKind.OuterProduct), Full(CovarianceKind.Robust), Full(CovarianceKind.Cluster),
            Full(CovarianceKind.ClusterUncorrected), Full(CovarianceKind.Jackknife), Full(CovarianceKind.TwoWay), Full(CovarianceKind.Bootstrap))
        {
            BiasReduced = Full(CovarianceKind.BiasReduced),
        };

        SquareMatrix? Full(CovarianceKind kind)
        {
            var path = "covariance." + JsonWords.Of(kind);
            if (inference.Covariances.GetValueOrDefault(kind) is not { Matrix: { } matrix } estimate)
            {
                book.Note(path, ParameterEntries.KindReason(kind, inference));
                return null;
            }

            var values = new double[entries.Length * entries.Length];
            for (var i = 0; i < entries.Length; i++)
                for (var j = 0; j < entries.Length; j++)
                {
                    if (entries[i].Place < 0 || entries[j].Place < 0) continue;
                    var refused = estimate.RefusedParameters.Contains(entries[i].Place) || estimate.RefusedParameters.Contains(entries[j].Place);
                    var value = refused ? double.NaN : matrix[entries[i].Place, entries[j].Place];
                    values[(i * entries.Length) + j] = value;
                    if (!double.IsFinite(value)) book.Note($"{path}[{i}][{j}]", "The figure is refused for a parameter of this row or column.");
                }

            return new SquareMatrix(entries.Length, ImmutableCollectionsMarshal.AsImmutableArray(values));
        }
    }
}
