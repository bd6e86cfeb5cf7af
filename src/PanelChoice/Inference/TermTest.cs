using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Estimation;

namespace PanelChoice.Inference;

/// <summary>A parameter that a test is about.</summary>
/// <param name="Parameter">Index in the layout.</param>
/// <param name="Name">Name of the term or nest.</param>
/// <param name="Alternative">Alternative under <c>each</c>; null otherwise.</param>
/// <param name="Kind">Coefficient or dissimilarity.</param>
public sealed record TestedParameter(int Parameter, string Name, string? Alternative, ParameterKind Kind)
{
    /// <summary>The name people read.</summary>
    public string Label => Alternative is null ? Name : $"{Name} [{Alternative}]";
}

/// <summary>A hypothesis on free parameters: all at given values, or all equal. Dissimilarities are compared by their logarithms.</summary>
/// <param name="Name">Name of the test.</param>
/// <param name="IsDefault">Whether it is made without being asked for.</param>
/// <param name="Terms">The parameters it is about.</param>
/// <param name="Null">The values, in the order of <paramref name="Terms"/>; null when they are claimed to be equal.</param>
public sealed record TermTest(string Name, bool IsDefault, ImmutableArray<TestedParameter> Terms, ImmutableArray<double>? Null)
{
    /// <summary>R and r over the free parameters.</summary>
    internal LinearRestriction Restriction { get; init; } = new([], []);

    /// <summary>Why the values to test against do not exist; null when they do.</summary>
    internal string? Withheld { get; init; }

    /// <summary>Whether it compares one parameter with a number, so that numbers that it does not reject make an interval.</summary>
    internal bool IsSingle => Terms.Length == 1 && Restriction.Matrix.Count(x => x != 0) == 1;
}

/// <summary>A statistic against a chi-square or F distribution, or the reason why there is none.</summary>
/// <param name="Statistic">The quadratic form; divided by the number of restrictions when <paramref name="DenominatorFreedom"/> is given.</param>
/// <param name="Freedom">Number of restrictions.</param>
/// <param name="DenominatorFreedom">Degrees of freedom of the covariance: the statistic is an F; null: a chi-square.</param>
/// <param name="PValue">The p-value.</param>
/// <param name="Reason">Why figures are missing; null when none is.</param>
public sealed record WaldFigures(double? Statistic, int Freedom, double? DenominatorFreedom, double? PValue, string? Reason);

/// <summary>The likelihood ratio of a test, valid only where occasions are independent.</summary>
/// <param name="Statistic">Twice the loss of log-likelihood by the restrictions.</param>
/// <param name="Freedom">Number of restrictions.</param>
/// <param name="PValue">Against the chi-square distribution.</param>
/// <param name="Note">On what it is valid.</param>
/// <param name="Reason">Why figures are missing; null when none is.</param>
public sealed record LikelihoodRatioFigures(double? Statistic, int Freedom, double? PValue, string Note, string? Reason);

/// <summary>What multiplies the scores of a cluster in the score bootstrap.</summary>
public enum ScoreWeights
{
    /// <summary>+1 or -1.</summary>
    Rademacher,

    /// <summary>One of +-sqrt(1/2), +-1, +-sqrt(3/2) (Webb 2014).</summary>
    SixPoint,
}

/// <summary>The score bootstrap of a test, its null hypothesis imposed (Kline and Santos 2012).</summary>
/// <param name="Weights">What multiplies the scores of a cluster.</param>
/// <param name="Draws">Sets of weights.</param>
/// <param name="Enumerated">Whether these are all there are.</param>
/// <param name="Statistic">The score statistic of the sample.</param>
/// <param name="PValue">The p-value.</param>
/// <param name="MonteCarloError">Its Monte-Carlo standard error; 0 when enumerated.</param>
/// <param name="Interval">Values of a single parameter that the test does not reject at the study's confidence.</param>
/// <param name="Reason">Why statistic and p-value are missing; null when they are not.</param>
/// <param name="IntervalReason">Why there is no interval; null when there is one.</param>
public sealed record ScoreBootstrapFigures(
    ScoreWeights Weights, int Draws, bool Enumerated, double? Statistic, double? PValue, double? MonteCarloError, Interval? Interval, string? Reason,
    string? IntervalReason);

/// <summary>All that is said of one test.</summary>
/// <param name="Test">The test.</param>
/// <param name="Wald">By kind of covariance.</param>
/// <param name="LikelihoodRatio">The likelihood ratio.</param>
/// <param name="ScoreBootstrap">The score bootstrap; null when it is not made.</param>
/// <param name="ScoreReason">Why there is no score bootstrap; null when there is.</param>
public sealed record TermTestResult(
    TermTest Test, ImmutableSortedDictionary<CovarianceKind, WaldFigures> Wald, LikelihoodRatioFigures LikelihoodRatio, ScoreBootstrapFigures? ScoreBootstrap,
    string? ScoreReason);
