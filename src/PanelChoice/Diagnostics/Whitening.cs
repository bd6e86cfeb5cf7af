using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

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
    public static Whitening? Of(ChoiceDesign design, NestedLogitForm form, ReadOnlySpan<double> parameters, int threads)
    {
        var theta = parameters.ToArray();
        var size = design.Layout.Free.Length;
        var parts = new (double[] Score, double[] Information)[FixedChunks.Count(design.Situations)];
        FixedChunks.Run(design.Situations, threads, (chunk, first, end) =>
        {
            var scores = new SituationScores(design, form, theta, null);
            var part = (Score: new double[size], Information: new double[size * size]);
            for (var t = first; t < end; t++)
            {
                scores.Load(t);
                for (var k = 0; k < size; k++) part.Score[k] += scores.Score[k];
                scores.AddInformation(part.Information);
            }

            parts[chunk] = part;
        });

        var total = new double[size];
        var information = new double[size * size];
        foreach (var part in parts)
        {
            for (var k = 0; k < size; k++) total[k] += part.Score[k];
            for (var k = 0; k < information.Length; k++) information[k] += part.Information[k];
        }

        if (BasisOf(information, size) is not { } basis) return null;
        var white = new double[size];
        for (var r = 0; r < size; r++)
            for (var c = 0; c < size; c++) white[r] += basis[(r * size) + c] * total[c];
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
