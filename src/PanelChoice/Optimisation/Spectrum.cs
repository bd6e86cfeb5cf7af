using MathNet.Numerics.LinearAlgebra;
using MathNet.Numerics.LinearAlgebra.Double;

namespace PanelChoice.Optimisation;

/// <summary>A symmetric matrix by its eigenvalues and eigenvectors.</summary>
internal sealed class Spectrum
{
    private readonly double[] vectors;

    private Spectrum(double[] values, double[] vectors)
    {
        Values = values;
        this.vectors = vectors;
    }

    /// <summary>Eigenvalues, ascending.</summary>
    public double[] Values { get; }

    /// <summary>Dimension.</summary>
    public int Count => Values.Length;

    /// <summary>The eigenvalue largest in absolute value, absolute.</summary>
    public double Largest => Count == 0 ? 0 : Math.Max(Math.Abs(Values[0]), Math.Abs(Values[^1]));

    /// <summary>Decomposes a symmetric matrix of finite numbers.</summary>
    /// <param name="matrix">n x n, row by row.</param>
    public static Spectrum Of(ReadOnlySpan<double> matrix)
    {
        var n = (int)Math.Round(Math.Sqrt(matrix.Length));
        if (n == 0) return new Spectrum([], []);
        var evd = new DenseMatrix(n, n, matrix.ToArray()).Evd(Symmetricity.Symmetric);
        var columns = evd.EigenVectors.ToColumnMajorArray();
        var values = evd.EigenValues.Select(v => v.Real).ToArray();
        var order = Enumerable.Range(0, n).OrderBy(i => values[i]).ToArray();
        var vectors = new double[n * n];
        for (var i = 0; i < n; i++)
        {
            // The sign of an eigenvector is arbitrary; its largest entry is made positive so that nothing hangs on the library's choice.
            var column = columns.AsSpan(order[i] * n, n);
            var largest = 0.0;
            foreach (var entry in column)
                if (Math.Abs(entry) > Math.Abs(largest) * (1 + 1e-9)) largest = entry;
            for (var k = 0; k < n; k++) vectors[(i * n) + k] = largest < 0 ? -column[k] : column[k];
        }

        return new Spectrum([.. order.Select(i => values[i])], vectors);
    }

    /// <summary>An eigenvector of length 1.</summary>
    public ReadOnlySpan<double> Vector(int i) => vectors.AsSpan(i * Count, Count);

    /// <summary>The coordinates of a vector along the eigenvectors.</summary>
    public double[] Coordinates(ReadOnlySpan<double> vector)
    {
        var along = new double[Count];
        for (var i = 0; i < Count; i++)
        {
            var sum = 0.0;
            var q = Vector(i);
            for (var k = 0; k < Count; k++) sum += q[k] * vector[k];
            along[i] = sum;
        }

        return along;
    }

    /// <summary>The vector that has the given coordinates along the eigenvectors.</summary>
    public double[] Combine(ReadOnlySpan<double> coordinates)
    {
        var vector = new double[Count];
        for (var i = 0; i < Count; i++)
        {
            var q = Vector(i);
            for (var k = 0; k < Count; k++) vector[k] += coordinates[i] * q[k];
        }

        return vector;
    }
}
