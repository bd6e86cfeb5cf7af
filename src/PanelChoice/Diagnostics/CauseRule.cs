using System.Collections.Immutable;
using MathNet.Numerics.Distributions;

namespace PanelChoice.Diagnostics;

/// <summary>A corrected moment and its variance: what the rule needs of a lag.</summary>
/// <param name="Lag">Distance in steps.</param>
/// <param name="Value">m_c.</param>
/// <param name="Variance">V.</param>
internal sealed record LagEvidence(int Lag, double Value, double Variance);

/// <summary>What the cause rule judges by; all of it from the static fit, the model without past choices.</summary>
/// <param name="DetectorPValue">Detector of the static fit.</param>
/// <param name="Lags">Lags that have pairs and variance.</param>
/// <param name="LastPrediction">The last occasion's prediction; null where it has no variance.</param>
internal sealed record CauseEvidence(double DetectorPValue, ImmutableArray<LagEvidence> Lags, LagEvidence? LastPrediction)
{
    /// <summary>Largest lag the rule looks at.</summary>
    public const int LargestLag = 6;

    /// <summary>The evidence in a battery of the static fit.</summary>
    public static CauseEvidence Of(ScoreBattery battery, double detectorPValue)
    {
        static LagEvidence? From(int lag, CorrectedScore score) => score.IsDefined ? new LagEvidence(lag, score.Value, score.Variance) : null;
        return new CauseEvidence(
            detectorPValue,
            [.. battery.Lags.Take(LargestLag).Select((s, h) => From(h + 1, s)).OfType<LagEvidence>()],
            From(1, battery.LastPrediction));
    }
}

/// <summary>What the rule found on the way, and where it came out.</summary>
/// <param name="Cause">The likely cause.</param>
/// <param name="Plateau">Dependence does not fade: the tail is there and is a good part of lag 2. The mark of lasting taste.</param>
/// <param name="Habit">The last occasion's prediction matters: what moved people then still acts through what they chose.</param>
/// <param name="Short">Lag 1 is above the tail. The mark of serially correlated errors when habit is absent.</param>
internal sealed record CauseJudgement(DependenceCause Cause, bool Plateau, bool Habit, bool Short);

/// <summary>
/// Which way independence fails, judged on the static fit with the person means of attributes in it. With c the one-sided normal
/// quantile of the level, gamma_h = m_h / V_h, and the tail lags 4 to 6:
/// <code>
/// g_tail  = sum m / sum V over the tail          z_tail = g_tail sqrt(sum V)
/// PLATEAU = z_tail > c and (g_tail / gamma_2 > 1/2 or gamma_2 &lt;= 0)
/// HABIT   = z of the last prediction > c
/// SHORT   = e / sqrt(1 / V_1 + 1 / sum V_tail) > c,     e = gamma_1 - max(0, g_tail)
/// PLATEAU, HABIT -> habit and taste;  PLATEAU -> taste;  HABIT -> habit;
/// SHORT and gamma_P + se(gamma_P) &lt; e / 2 -> serially correlated errors;  else cannot be told
/// </code>
/// Lagged predictors tell true state dependence from correlated errors, because only habit carries yesterday's conditions forward.
/// Thresholds were set on simulated panels and scored on others (the measured rates stand beside the verdict).
/// </summary>
internal static class CauseRule
{
    private const int FirstTailLag = 4;

    /// <summary>Judges the evidence.</summary>
    /// <param name="evidence">Evidence of the static fit.</param>
    /// <param name="level">Significance level.</param>
    public static CauseJudgement Judge(CauseEvidence evidence, double level)
    {
        ArgumentNullException.ThrowIfNull(evidence);
        var critical = Normal.InvCDF(0, 1, 1 - level);
        var first = evidence.Lags.FirstOrDefault(l => l.Lag == 1);
        var second = evidence.Lags.FirstOrDefault(l => l.Lag == 2);
        var tail = evidence.Lags.Where(l => l.Lag >= FirstTailLag).ToList();
        var tailVariance = tail.Sum(l => l.Variance);
        var tailEffect = tail.Count > 0 ? tail.Sum(l => l.Value) / tailVariance : 0;
        var secondEffect = second is null ? double.NaN : second.Value / second.Variance;

        var plateau = tail.Count > 0 && tailEffect * Math.Sqrt(tailVariance) > critical
            && (secondEffect <= 0 || tailEffect / secondEffect > 0.5);
        var habit = evidence.LastPrediction is { } p && p.Value / Math.Sqrt(p.Variance) > critical;
        var excess = first is null ? double.NaN : (first.Value / first.Variance) - Math.Max(0, tailEffect);
        var isShort = first is not null && tail.Count > 0 && excess / Math.Sqrt((1 / first.Variance) + (1 / tailVariance)) > critical;
        var noHabit = evidence.LastPrediction is { } q && (q.Value / q.Variance) + (1 / Math.Sqrt(q.Variance)) < excess / 2;

        var cause = evidence.DetectorPValue > level ? DependenceCause.Unclear
            : plateau ? (habit ? DependenceCause.HabitAndTaste : DependenceCause.Taste)
            : habit ? DependenceCause.Habit
            : isShort && noHabit ? DependenceCause.SerialErrors
            : DependenceCause.Unclear;
        return new CauseJudgement(cause, plateau, habit, isShort);
    }
}
