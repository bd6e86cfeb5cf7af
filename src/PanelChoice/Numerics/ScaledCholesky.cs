namespace PanelChoice.Numerics;

/// <summary>
/// Cholesky factor of a symmetric matrix scaled to unit diagonal, so that the units of the covariates do not decide what counts as
/// singular. A pivot is then 1 - R^2 of a column given those before it. A matrix that is not positive definite is an ordinary outcome
/// here, not an exception, and the column that fails is named; that is why the factorisation is written out.
/// </summary>
internal sealed class ScaledCholesky
{
    private readonly double[] scale;
    private readonly double[] lower;
    private readonly int n;

    private ScaledCholesky(int n, double[] scale, double[] lower)
    {
        this.n = n;
        this.scale = scale;
        this.lower = lower;
    }

    /// <summary>Factors a matrix.</summary>
    /// <param name="matrix">n x n, row by row; the lower triangle is read.</param>
    /// <param name="n">Its order.</param>
    /// <param name="failed">The first column whose pivot is not positive beyond rounding; -1 when the matrix is positive definite.</param>
    /// <returns>The factor; null when the matrix is not positive definite.</returns>
    public static ScaledCholesky? Factor(ReadOnlySpan<double> matrix, int n, out int failed)
    {
        // Below this a pivot has no correct digit left.
        var smallest = n * 1e-14;
        var scale = new double[n];
        var lower = new double[n * n];
        for (failed = 0; failed < n; failed++)
        {
            var diagonal = matrix[(failed * n) + failed];
            if (!(diagonal > 0) || !double.IsFinite(diagonal)) return null;
            scale[failed] = 1 / Math.Sqrt(diagonal);
        }

        for (failed = 0; failed < n; failed++)
        {
            for (var c = 0; c <= failed; c++)
            {
                var sum = matrix[(failed * n) + c] * scale[failed] * scale[c];
                for (var k = 0; k < c; k++) sum -= lower[(failed * n) + k] * lower[(c * n) + k];
                if (c < failed) lower[(failed * n) + c] = sum / lower[(c * n) + c];
                else if (sum > smallest) lower[(c * n) + c] = Math.Sqrt(sum);
                else return null;
            }
        }

        failed = -1;
        return new ScaledCholesky(n, scale, lower);
    }

    /// <summary>Solves in place: the right-hand side becomes the solution.</summary>
    public void Solve(Span<double> b)
    {
        for (var r = 0; r < n; r++)
        {
            var sum = b[r] * scale[r];
            for (var k = 0; k < r; k++) sum -= lower[(r * n) + k] * b[k];
            b[r] = sum / lower[(r * n) + r];
        }

        for (var r = n - 1; r >= 0; r--)
        {
            var sum = b[r];
            for (var k = r + 1; k < n; k++) sum -= lower[(k * n) + r] * b[k];
            b[r] = sum / lower[(r * n) + r];
        }

        for (var r = 0; r < n; r++) b[r] *= scale[r];
    }

    /// <summary>
    /// The lower triangular W with W A W' = I for the matrix A that was factored, so that A^-1 = W'W; n x n, row by row.
    /// </summary>
    public double[] Whitener()
    {
        var whitener = new double[n * n];
        for (var c = 0; c < n; c++)
            for (var r = c; r < n; r++)
            {
                var sum = r == c ? scale[c] : 0;
                for (var k = c; k < r; k++) sum -= lower[(r * n) + k] * whitener[(k * n) + c];
                whitener[(r * n) + c] = sum / lower[(r * n) + r];
            }

        return whitener;
    }

    /// <summary>The inverse, n x n, exactly symmetric.</summary>
    public double[] Inverse()
    {
        var inverse = new double[n * n];
        var column = new double[n];
        for (var c = 0; c < n; c++)
        {
            Array.Clear(column);
            column[c] = 1;
            Solve(column);
            for (var r = c; r < n; r++) inverse[(r * n) + c] = inverse[(c * n) + r] = column[r];
        }

        return inverse;
    }
}
