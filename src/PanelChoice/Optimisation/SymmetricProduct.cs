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
}
