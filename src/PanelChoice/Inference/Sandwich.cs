using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>The sums of products that the sandwich estimators share. All matrices are F x F, row by row.</summary>
internal static class Sandwich
{
    /// <summary>sum r r' over the rows of an array; chunks are added in fixed order, so threads change no bit.</summary>
    public static double[] OuterSum(ReadOnlyMemory<double> rows, int f, int threads)
    {
        var count = f == 0 ? 0 : rows.Length / f;
        var parts = new double[FixedChunks.Count(count)][];
        FixedChunks.Run(count, threads, (chunk, first, end) =>
        {
            var sum = new double[f * f];
            for (var i = first; i < end; i++)
            {
                var row = rows.Span.Slice(i * f, f);
                for (var r = 0; r < f; r++)
                    for (var c = 0; c <= r; c++) sum[(r * f) + c] += row[r] * row[c];
            }

            parts[chunk] = sum;
        });
        var total = new double[f * f];
        foreach (var part in parts)
            for (var i = 0; i < total.Length; i++) total[i] += part[i];
        Mirror(total, f);
        return total;
    }

    /// <summary>factor x bread meat bread.</summary>
    public static double[] Of(double[] bread, ReadOnlySpan<double> meat, double factor, int f)
    {
        var half = new double[f * f];
        for (var r = 0; r < f; r++)
            for (var k = 0; k < f; k++)
                for (var c = 0; c < f; c++) half[(r * f) + c] += bread[(r * f) + k] * meat[(k * f) + c];
        var whole = new double[f * f];
        for (var r = 0; r < f; r++)
            for (var c = 0; c <= r; c++)
            {
                for (var k = 0; k < f; k++) whole[(r * f) + c] += half[(r * f) + k] * bread[(k * f) + c];
                whole[(r * f) + c] *= factor;
            }

        Mirror(whole, f);
        return whole;
    }

    private static void Mirror(double[] lower, int f)
    {
        for (var r = 0; r < f; r++)
            for (var c = 0; c < r; c++) lower[(c * f) + r] = lower[(r * f) + c];
    }
}
