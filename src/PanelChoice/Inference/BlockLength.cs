namespace PanelChoice.Inference;

/// <summary>
/// Length of blocks from the data (Politis and White 2004, with the correction of Patton, Politis and White 2009): b = (2 g^2 / d)^(1/3) n^(1/3),
/// g = sum h(k/m) |k| gamma_k and d = 4/3 (sum h(k/m) gamma_k)^2 over lags k from -m to m, gamma the autocovariances, h(x) = 1 up to 1/2 and 2 (1 - x) beyond, m twice
/// the lag after which max(5, log10 n) autocorrelations stay within 2 sqrt(log10 n / n). For several records n is the number of values in all, which the
/// variance of the estimated variance falls with, and the autocovariances are pooled; what a record can hold bounds the length: min(3 sqrt T, T/3), T its
/// (median) number of values. With one record it is their rule.
/// </summary>
internal static class BlockLength
{
    /// <summary>The length.</summary>
    /// <param name="values">Values of all records, one record after another.</param>
    /// <param name="start">First value of each record; one more entry closes the last.</param>
    public static int Of(double[] values, IReadOnlyList<int> start)
    {
        var lengths = Enumerable.Range(0, start.Count - 1).Select(i => start[i + 1] - start[i]).Order().ToArray();
        var n = values.Length;
        double median = lengths[lengths.Length / 2];
        var most = Math.Max(1, (int)Math.Ceiling(Math.Min(3 * Math.Sqrt(median), median / 3)));
        var run = Math.Max(5, (int)Math.Log10(n));
        var lags = Math.Min((int)Math.Ceiling(Math.Sqrt(lengths[^1])) + run, lengths[^1] - 1);
        var gamma = Autocovariances(values, start, lags + run);
        if (!(gamma[0] > 0)) return 1;
        var bound = 2 * Math.Sqrt(Math.Log10(n) / n) * gamma[0];
        var quiet = lags;
        for (var m = 0; m <= lags; m++)
        {
            if (Enumerable.Range(m + 1, run).Any(k => Math.Abs(gamma[k]) >= bound)) continue;
            quiet = m;
            break;
        }

        var width = Math.Min(2 * Math.Max(quiet, 1), lags);
        double g = 0, sum = gamma[0];
        for (var k = 1; k <= width; k++)
        {
            var h = Math.Min(1, 2 * (1 - (k / (double)width)));
            g += 2 * h * k * gamma[k];
            sum += 2 * h * gamma[k];
        }

        var d = 4 / 3.0 * sum * sum;
        var length = Math.Cbrt(2 * g * g / d * n);
        return double.IsNaN(length) ? 1 : (int)Math.Clamp(Math.Round(length), 1, most);
    }

    /// <summary>Autocovariances of lags 0 to <paramref name="lags"/>, each record around its own mean; 0 beyond the longest record.</summary>
    private static double[] Autocovariances(double[] values, IReadOnlyList<int> start, int lags)
    {
        var gamma = new double[lags + 1];
        for (var i = 0; i + 1 < start.Count; i++)
        {
            var record = values.AsSpan(start[i], start[i + 1] - start[i]);
            if (record.IsEmpty) continue;
            var mean = 0.0;
            foreach (var x in record) mean += x;
            mean /= record.Length;
            for (var k = 0; k <= Math.Min(lags, record.Length - 1); k++)
                for (var t = k; t < record.Length; t++) gamma[k] += (record[t] - mean) * (record[t - k] - mean);
        }

        for (var k = 0; k < gamma.Length; k++) gamma[k] /= values.Length;
        return gamma;
    }
}
