namespace PanelChoice.Diagnostics;

/// <summary>
/// A moment after the two corrections without which it is no test: the estimation effect is taken off the moment and off its variance
/// (parameters were estimated from the same choices), and the second-order bias of fitted residuals is added back.
/// <code>
/// C = A_ms A_ss^-1    m~ = m - C s_total    V = A_mm - C A_sm    m_c = m~ + b    z = m_c / sqrt(V)    one-step effect m_c / V, sd 1 / sqrt(V)
/// </code>
/// </summary>
/// <param name="Value">m_c.</param>
/// <param name="Variance">V.</param>
/// <param name="Raw">m, without any correction.</param>
/// <param name="RawVariance">A_mm.</param>
/// <param name="Bias">b.</param>
/// <param name="Pairs">Situations (for lags: pairs) that enter.</param>
internal sealed record CorrectedScore(double Value, double Variance, double Raw, double RawVariance, double Bias, int Pairs)
{
    /// <summary>Share of A_mm that must be left after the estimation effect for the moment to say anything.</summary>
    public const double SmallestShare = 1e-9;

    /// <summary>Whether the moment has any variance left.</summary>
    public bool IsDefined => double.IsFinite(Value) && RawVariance > 0 && Variance > SmallestShare * RawVariance;

    /// <summary>z; NaN when undefined.</summary>
    public double Z => IsDefined ? Value / Math.Sqrt(Variance) : double.NaN;

    /// <summary>One-step effect size; NaN when undefined.</summary>
    public double Effect => IsDefined ? Value / Variance : double.NaN;

    /// <summary>Null standard deviation of the effect size; NaN when undefined.</summary>
    public double EffectError => IsDefined ? 1 / Math.Sqrt(Variance) : double.NaN;

    /// <summary>Corrects one moment.</summary>
    /// <param name="sums">Sums in the whitening basis.</param>
    /// <param name="moment">Index of the moment.</param>
    /// <param name="totalScore">Total score in the same basis.</param>
    public static CorrectedScore Of(MomentSums sums, int moment, ReadOnlySpan<double> totalScore)
    {
        var row = sums.ScoresOf(moment);
        double shift = 0, absorbed = 0;
        for (var k = 0; k < row.Length; k++)
        {
            shift += row[k] * totalScore[k];
            absorbed += row[k] * row[k];
        }

        return new CorrectedScore(
            sums.Moment[moment] - shift + sums.Bias[moment], sums.Variance[moment] - absorbed, sums.Moment[moment], sums.Variance[moment],
            sums.Bias[moment], sums.Pairs[moment]);
    }
}
