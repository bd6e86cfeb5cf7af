using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>Tests of terms: Wald with every covariance, the likelihood ratio, and the score bootstrap.</summary>
internal static class TermTests
{
    private const string OnlyIndependent = "It takes every occasion for independent evidence and is valid only where they are.";

    private const string WeightUnit = "It depends on the unit of the sampling weights, so no test is made from it.";

    /// <summary>Makes them. What cannot be had is refused with its reason.</summary>
    /// <param name="input">What is known of the fitted model.</param>
    /// <param name="tests">The tests.</param>
    /// <param name="inference">The covariances.</param>
    /// <param name="refitter">Estimates under restrictions.</param>
    /// <param name="settings">Confidence, draws, seed.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static ImmutableArray<TermTestResult> Run(
        InferenceInput input, ImmutableArray<TermTest> tests, InferenceResult inference, IRestrictedRefitter refitter, InferenceSettings settings, WorkContext work)
    {
        var results = ImmutableArray.CreateBuilder<TermTestResult>();
        var obstacle = StandardErrors.Obstacle(input);
        var bootstrap = new ScoreBootstrap(input, refitter, settings, work);
        var noScores = ScoreBootstrap.DrawsOf(input, settings) > 0 ? null
            : settings.ScoreDraws == 0 ? "The study asks for none."
            : $"With {input.Clusters.Length} clusters it is made only where [inference] score_draws asks for it.";
        foreach (var test in tests)
        {
            work.Report("tests of terms", results.Count, tests.Length);
            var wald = WaldTests.Kinds.ToImmutableSortedDictionary(
                k => k, k => WaldTests.Of(input, test, inference.Covariances.GetValueOrDefault(k) ?? CovarianceEstimate.Refused(k, "There is no such covariance."), inference.Bootstrap));
            var reason = obstacle ?? test.Withheld;
            var restricted = reason is null ? refitter.Fit(test.Restriction) : null;
            reason ??= restricted!.Failure;
            var scores = reason is null && noScores is null
                ? bootstrap.Of(test, restricted!, inference.Covariances.GetValueOrDefault(CovarianceKind.Cluster))
                : null;
            results.Add(new TermTestResult(test, wald, Ratio(input, test, restricted, refitter, reason), scores, scores is null ? noScores ?? reason : scores.Reason));
        }

        if (tests.Length > 0) work.Report("tests of terms", tests.Length, tests.Length);
        return results.ToImmutable();
    }

    private static LikelihoodRatioFigures Ratio(InferenceInput input, TermTest test, RestrictedFit? restricted, IRestrictedRefitter refitter, string? reason)
    {
        var q = test.Restriction.Count;
        if (restricted is null || reason is not null) return new LikelihoodRatioFigures(null, q, null, OnlyIndependent, reason);
        // A restricted maximum above the free one by more than rounding would mean that the free search missed the higher one.
        var statistic = 2 * (refitter.LogLikelihood - restricted.LogLikelihood);
        if (statistic < -1e-6 * input.MeanWeight)
            return new LikelihoodRatioFigures(
                null, q, null, OnlyIndependent, "With the restrictions in force a higher maximum was found than without them: ask for more starts.");
        statistic = Math.Max(0, statistic);
        return input.IsWeighted
            ? new LikelihoodRatioFigures(statistic, q, null, OnlyIndependent, WeightUnit)
            : new LikelihoodRatioFigures(statistic, q, WaldTests.UpperChiSquare(q, statistic), OnlyIndependent, null);
    }
}
