using System.Collections.Immutable;

namespace PanelChoice.Diagnostics;

/// <summary>Verdict on independence.</summary>
public enum Verdict
{
    /// <summary>No sign of dependence. Never "independent".</summary>
    NoneFound,

    /// <summary>Dependence found.</summary>
    Dependence,

    /// <summary>Nothing to test.</summary>
    NotApplicable,
}

/// <summary>Likely cause of dependence.</summary>
public enum DependenceCause
{
    /// <summary>Lasting taste.</summary>
    Taste,

    /// <summary>Habit left out of the model.</summary>
    Habit,

    /// <summary>Habit and lasting taste together.</summary>
    HabitAndTaste,

    /// <summary>Serially correlated shocks: drifting conditions.</summary>
    SerialErrors,

    /// <summary>Cannot be told.</summary>
    Unclear,
}

/// <summary>The detector's statistic at one decay.</summary>
/// <param name="Rho">Decay of past residuals, 0 to 1.</param>
/// <param name="Z">Bias-corrected score over its null standard deviation; NaN where no pair of occasions gives it any variance.</param>
public sealed record DecayScore(double Rho, double Z);

/// <summary>The detector: maximum over decays, with its p-value from seeded normal draws.</summary>
/// <param name="Statistic">Largest z.</param>
/// <param name="PValue">Share of draws at least as large, (1 + count) / (draws + 1).</param>
/// <param name="ByDecay">z at each decay.</param>
public sealed record Detector(double Statistic, double PValue, ImmutableArray<DecayScore> ByDecay);

/// <summary>Score for shocks shared by everybody on the same occasion.</summary>
/// <param name="Z">One-sided z.</param>
/// <param name="PValue">One-sided p-value; it allows for the skewness of the null distribution, so it is not the normal tail beyond z.</param>
public sealed record DateScore(double Z, double PValue);

/// <summary>Dependence at one lag: one-step effect size.</summary>
/// <param name="Lag">Distance in calendar steps (or recorded occasions).</param>
/// <param name="Gamma">Effect size; NaN, like its error, where no pair of occasions lies at this distance.</param>
/// <param name="StandardError">Its null standard error.</param>
/// <param name="Pairs">Pairs of situations at that distance.</param>
public sealed record LagDependence(int Lag, double Gamma, double StandardError, int Pairs);

/// <summary>Persistence in one alternative or nest.</summary>
/// <param name="Name">Name of the alternative or nest.</param>
/// <param name="Z">z of its running sum of past residuals; NaN where it has no variance.</param>
public sealed record PartScore(string Name, double Z);

/// <summary>How often the cause rule is right on simulated panels of about this size.</summary>
/// <param name="Rate">Share of right answers.</param>
/// <param name="Source">Which simulation it comes from.</param>
public sealed record HitRate(double Rate, string Source);

/// <summary>The independence battery's outcome.</summary>
/// <param name="Verdict">The verdict.</param>
/// <param name="Reason">Why there is nothing to test; null otherwise.</param>
/// <param name="Cause">Likely cause; null without dependence or when only common days were found.</param>
/// <param name="CommonDays">Whether people are moved by the same days; null when it could not be tested.</param>
/// <param name="Level">Significance level.</param>
/// <param name="Detector">The detector; null when not applicable.</param>
/// <param name="DateScore">The date score; null when not applicable.</param>
/// <param name="Lags">Dependence by lag.</param>
/// <param name="ByAlternative">Persistence by alternative.</param>
/// <param name="ByNest">Persistence by nest.</param>
/// <param name="VarianceInflation">Average variance inflation of the pooled covariance; null when not applicable.</param>
/// <param name="HitRate">Hit rate of the cause rule; null without a cause.</param>
/// <param name="LastPrediction">z of the last occasion's predicted probabilities in the static fit (sign of true habit); null when not computed.</param>
/// <param name="StepUnit">Unit of the distances: "recorded occasion", "step", "day", "workday", "week".</param>
/// <param name="Notes">Sentences that must stand beside the verdict (power, analytic p-value, unweighted fit, means left out, ...).</param>
public sealed record DiagnosticsResult(
    Verdict Verdict, string? Reason, DependenceCause? Cause, bool? CommonDays, double Level, Detector? Detector, DateScore? DateScore,
    ImmutableArray<LagDependence> Lags, ImmutableArray<PartScore> ByAlternative, ImmutableArray<PartScore> ByNest, double? VarianceInflation,
    HitRate? HitRate, double? LastPrediction, string StepUnit, ImmutableArray<string> Notes);
