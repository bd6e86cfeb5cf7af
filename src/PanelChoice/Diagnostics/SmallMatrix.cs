namespace PanelChoice.Diagnostics;

/// <summary>Sums of products of small row-by-row matrices, as plain loops.</summary>
internal static class SmallMatrix
{
    /// <summary>Adds A B (A: rows x inner, B: inner x columns).</summary>
    public static void AddProduct(ReadOnlySpan<double> a, ReadOnlySpan<double> b, int rows, int inner, int columns, Span<double> into)
    {
        for (var r = 0; r < rows; r++)
            for (var i = 0; i < inner; i++)
            {
                var f = a[(r * inner) + i];
                if (f == 0) continue;
                for (var c = 0; c < columns; c++) into[(r * columns) + c] += f * b[(i * columns) + c];
            }
    }

    /// <summary>Adds a matrix.</summary>
    public static void Add(ReadOnlySpan<double> a, Span<double> into)
    {
        for (var k = 0; k < into.Length; k++) into[k] += a[k];
    }

    /// <summary>Sum of the elementwise product: tr(A'B).</summary>
    public static double Dot(ReadOnlySpan<double> a, ReadOnlySpan<double> b)
    {
        var sum = 0.0;
        for (var k = 0; k < a.Length; k++) sum += a[k] * b[k];
        return sum;
    }

    /// <summary>Trace of a square matrix.</summary>
    public static double Trace(ReadOnlySpan<double> a, int size)
    {
        var sum = 0.0;
        for (var k = 0; k < size; k++) sum += a[(k * size) + k];
        return sum;
    }
}
