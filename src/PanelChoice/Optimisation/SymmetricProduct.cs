using System.Numerics.Tensors;

namespace PanelChoice.Optimisation;

/// <summary>Products with a symmetric matrix held row by row.</summary>
internal static class SymmetricProduct
{
    /// <summary>Matrix times vector.</summary>
    public static double[] Of(ReadOnlySpan<double> matrix, ReadOnlySpan<double> vector)
    {
        var product = new double[vector.Length];
        for (var i = 0; i < product.Length; i++) product[i] = TensorPrimitives.Dot(matrix.Slice(i * product.Length, product.Length), vector);
        return product;
    }

    /// <summary>Squared Frobenius norm of M^-1/2 A M^-1/2: the size of a matrix A as a share of a positive definite M.</summary>
    /// <param name="matrix">A, n x n.</param>
    /// <param name="inverse">The inverse of M, n x n.</param>
    /// <param name="n">n.</param>
    public static double SquaredShare(ReadOnlySpan<double> matrix, ReadOnlySpan<double> inverse, int n)
    {
        // It is the trace of (M^-1 A)^2.
        var share = new double[n * n];
        for (var i = 0; i < n; i++) Of(matrix, inverse.Slice(i * n, n)).CopyTo(share, i * n);
        var sum = 0.0;
        for (var i = 0; i < n; i++)
            for (var j = 0; j < n; j++) sum += share[(i * n) + j] * share[(j * n) + i];
        return Math.Max(0, sum);
    }
}
