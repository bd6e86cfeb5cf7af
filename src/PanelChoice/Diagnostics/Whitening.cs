using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;

namespace PanelChoice.Diagnostics;

/// <summary>
/// The basis in which the expected information of the free parameters is the identity: B with B A_ss B' = I, so that A_ss^-1 = B'B.
/// A_ss is the sum over situations of the expected information, not minus the Hessian: the information identity that removes the
/// estimation effect needs the expected one.
/// </summary>
/// <param name="Basis">B, K x K row by row.</param>
/// <param name="TotalScore">Sum of B s over situations; about 0 at a maximum.</param>
/// <param name="Information">A_ss in the parameters' own units, K x K.</param>
internal sealed record Whitening(double[] Basis, double[] TotalScore, double[] Information)
{
    /// <summary>Smallest eigenvalue of the information, scaled to a unit diagonal, below which it counts as singular.</summary>
    public const double SmallestEigenvalue = 1e-12;

    /// <summary>Whitens the information of a design at given parameters; null when it is singular or not finite.</summary>
    /// <param name="kernel">The design's residuals at the parameters.</param>
    /// <param name="threads">Threads; no figure depends on it.</param>
    public static Whitening? Of(ResidualKernel kernel, int threads)
    {
        var design = kernel.Layout.Design;
        var size = kernel.Layout.K;
        var width = PaddedRows.Padded(size);
        var parts = new double[FixedChunks.Count(design.Blocks.Length) * width * (width + 1)];
        kernel.ForEachChunk(threads, (residuals, chunk, first, end) =>
        {
            var scores = new SituationScores(residuals, null);
            var part = parts.AsMemory(chunk * width * (width + 1), width * (width + 1));
            for (var b = first; b < end; b++)
                scores.ForEach(design.Blocks[b], _ =>
                {
                    PaddedRows.Add(1, scores.Score, part.Span[..width]);
                    scores.AddInformation(part.Span[width..]);
                });
        });

        var sums = FixedChunks.Sum(parts, width * (width + 1));
        var information = PaddedRows.Symmetric(sums.AsSpan(width), size);
        if (BasisOf(information, size) is not { } basis) return null;
        var white = new double[size];
        for (var r = 0; r < size; r++)
            for (var c = 0; c < size; c++) white[r] += basis[(r * size) + c] * sums[c];
        return new Whitening(basis, white, information);
    }

    /// <summary>B with B A B' = I by the eigenvectors of A scaled to a unit diagonal; null when A is singular or not finite.</summary>
    internal static double[]? BasisOf(double[] information, int size)
    {
        var scale = new double[size];
        for (var k = 0; k < size; k++)
        {
            scale[k] = Math.Sqrt(information[(k * size) + k]);
            if (!(scale[k] > 0) || !double.IsFinite(scale[k])) return null;
        }

        if (size == 0 || information.Any(x => !double.IsFinite(x))) return null;
        // Averaging the two halves makes the matrix exactly symmetric, which the symmetric eigenvalue routine relies on.
        var correlation = Matrix<double>.Build.Dense(
            size, size, (r, c) => (information[(r * size) + c] + information[(c * size) + r]) / (2 * scale[r] * scale[c]));
        var eigen = correlation.Evd(Symmetricity.Symmetric);
        var basis = new double[size * size];
        for (var r = 0; r < size; r++)
        {
            var value = eigen.EigenValues[r].Real;
            if (!(value > SmallestEigenvalue)) return null;
            for (var c = 0; c < size; c++) basis[(r * size) + c] = eigen.EigenVectors[c, r] / (Math.Sqrt(value) * scale[c]);
        }

        return basis;
    }
}
