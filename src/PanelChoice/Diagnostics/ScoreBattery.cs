using System.Collections.Immutable;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>All scores of one fitted design.</summary>
/// <param name="Decays">The detector's scores, in the order of <see cref="PersonHistory.Decays"/>.</param>
/// <param name="DecayCovariance">V of the decays, row by row.</param>
/// <param name="RawDecayCovariance">A_mm of the decays: what V would be if the parameters were known; shows what the estimation effect is worth.</param>
/// <param name="Lags">Lags 1, 2, ...</param>
/// <param name="Alternatives">Running sum of each alternative.</param>
/// <param name="Nests">Running sum of each nest, in the order of the layout's nests.</param>
/// <param name="LastPrediction">The last occasion's predicted probabilities: moved by true habit, not by taste or correlated errors.</param>
/// <param name="InformationTrace">The information trace.</param>
/// <param name="Date">The date score; null without a shared calendar or without any date of two persons.</param>
/// <param name="FreeParameters">K.</param>
internal sealed record ScoreBattery(
    ImmutableArray<CorrectedScore> Decays, ImmutableArray<double> DecayCovariance, ImmutableArray<double> RawDecayCovariance,
    ImmutableArray<CorrectedScore> Lags,
    ImmutableArray<CorrectedScore> Alternatives, ImmutableArray<CorrectedScore> Nests, CorrectedScore LastPrediction,
    CorrectedScore InformationTrace, DateMoment? Date, int FreeParameters)
{
    /// <summary>
    /// Average variance inflation of the pooled covariance: tr(A_ss^-1 sum of s_n s_n') / K over persons n, which is
    /// 1 + 2 m_c / K with m_c of the information trace.
    /// </summary>
    public double VarianceInflation => 1 + (2 * InformationTrace.Value / FreeParameters);

    /// <summary>Computes every score; null when the information of the free parameters is singular.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">The form.</param>
    /// <param name="parameters">All parameters, at a maximum (a small remaining score is harmless: it is projected out).</param>
    /// <param name="positions">Where the situations stand in time.</param>
    /// <param name="lags">Largest lag.</param>
    /// <param name="dates">Date of each situation; null without a shared calendar.</param>
    /// <param name="demeanByDate">Whether earlier residuals are taken as deviations from their date's mean; needs dates.</param>
    /// <param name="threads">Threads; no figure depends on it.</param>
    public static ScoreBattery? Compute(
        ChoiceDesign design, NestedLogitForm form, ImmutableArray<double> parameters, OccasionPositions positions, int lags,
        CompactNumbers? dates, bool demeanByDate, int threads)
    {
        return Compute(ResidualKernel.Create(design, form, parameters.AsSpan()), positions, lags, dates, demeanByDate, threads);
    }

    /// <summary>The same by a given kernel.</summary>
    internal static ScoreBattery? Compute(
        ResidualKernel kernel, OccasionPositions positions, int lags, CompactNumbers? dates, bool demeanByDate, int threads)
    {
        if (Whitening.Of(kernel, threads) is not { } white) return null;
        var byDate = dates is { } d ? DateSums.Sum(kernel, white.Basis, d, threads) : null;
        var (layout, sums) = SerialMoments.Sum(kernel, white.Basis, positions, lags, demeanByDate ? byDate : null, threads);
        CorrectedScore Score(int moment) => CorrectedScore.Of(sums, moment, white.TotalScore);

        var size = PersonHistory.Decays.Length;
        var covariance = (double[])sums.DecayCovariance.Clone();
        for (var r = 0; r < size; r++)
            for (var c = 0; c < size; c++)
            {
                var left = sums.ScoresOf(r);
                var right = sums.ScoresOf(c);
                for (var k = 0; k < left.Length; k++) covariance[(r * size) + c] -= left[k] * right[k];
            }

        return new ScoreBattery(
            [.. Enumerable.Range(0, size).Select(r => Score(MomentLayout.Decay(r)))],
            [.. covariance],
            [.. sums.DecayCovariance],
            [.. Enumerable.Range(1, lags).Select(h => Score(MomentLayout.Lag(h)))],
            [.. Enumerable.Range(0, layout.Alternatives).Select(j => Score(layout.Alternative(j)))],
            [.. Enumerable.Range(0, layout.Nests).Select(m => Score(layout.Nest(m)))],
            Score(layout.LastPrediction),
            Score(layout.InformationTrace),
            byDate is { Pairs.Dates: > 0 } ? byDate.Pairs.Moment(white.TotalScore) : null,
            sums.Parameters);
    }

    /// <summary>Correlation matrix of the decays that are defined, and their indices.</summary>
    public (ImmutableArray<int> Defined, Matrix<double> Correlation) DecayCorrelation()
    {
        var size = Decays.Length;
        ImmutableArray<int> defined = [.. Enumerable.Range(0, size).Where(r => Decays[r].IsDefined)];
        var v = DecayCovariance;
        if (defined.IsEmpty) return (defined, Matrix<double>.Build.Dense(1, 1));
        return (defined, Matrix<double>.Build.Dense(
            defined.Length, defined.Length,
            (r, c) => r == c ? 1 : v[(defined[r] * size) + defined[c]]
                / Math.Sqrt(v[(defined[r] * size) + defined[r]] * v[(defined[c] * size) + defined[c]])));
    }
}
