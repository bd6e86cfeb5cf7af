using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>
/// Score bootstrap with the null hypothesis imposed (Kline and Santos 2012): the model is estimated once with the restrictions in force, and what clusters contribute to the score there is
/// multiplied by signs. With few clusters it keeps its level where t tests do not: in simulations made for this project 4, 6 and 5.4 percent at 10, 20 and 40 clusters for a
/// nominal 5, against 19, 12 and 8 of the clustered t test. It stays with the maximum near the estimate and cannot reveal another.
/// </summary>
/// <param name="input">What is known of the fitted model.</param>
/// <param name="refitter">Estimates under restrictions.</param>
/// <param name="settings">Confidence, draws, seed.</param>
/// <param name="work">Threads and cancellation; no figure depends on them.</param>
internal sealed class ScoreBootstrap(InferenceInput input, IRestrictedRefitter refitter, InferenceSettings settings, WorkContext work)
{
    /// <summary>Draws where the study does not say and clusters are few; 1,000 times 0.05 is a whole number with the sample counted in.</summary>
    public const int UsualDraws = 999;

    private const string NoMaximum = "Before a value is rejected the model loses its maximum, so the ends of an interval cannot be found.";

    private const int MostSteps = 8;

    /// <summary>First step away from the estimate in clustered standard errors, at most; t has far quantiles with two or three clusters.</summary>
    private const double LongestFirstStep = 4;

    private const double StepGrowth = 1.6;

    /// <summary>How closely the ends of an interval are found, in clustered standard errors.</summary>
    private const double Closeness = 0.002;

    private readonly Lazy<ScaledCholesky?> informationAtEstimate = new(() => FactorOf(refitter.At(input.Estimates.AsSpan()), input.Free.Length));

    /// <summary>How many draws the settings ask for: by default none with 40 clusters or more.</summary>
    public static int DrawsOf(InferenceInput input, InferenceSettings settings) =>
        settings.ScoreDraws ?? (input.Clusters.Length < ClusterCovariance.FewClusters ? UsualDraws : 0);

    /// <summary>One test.</summary>
    /// <param name="test">The test.</param>
    /// <param name="restricted">The model with its restrictions in force, at a maximum.</param>
    /// <param name="cluster">The clustered covariance: a yardstick for where to look for the ends of an interval.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public ScoreBootstrapFigures Of(TermTest test, RestrictedFit restricted, CovarianceEstimate? cluster)
    {
        var clusters = input.Clusters.Length;
        var multipliers = new ScoreMultipliers(Math.Max(2, clusters), DrawsOf(input, settings), settings.Confidence, settings.BootstrapSeed);
        ScoreBootstrapFigures Refuse(string reason) => new(multipliers.Weights, multipliers.Draws, multipliers.IsEnumerated, null, null, null, null, reason, reason);
        if (clusters < 2) return Refuse("There is one cluster only.");
        if (test.Restriction.Count > clusters - 1)
            return Refuse($"{test.Restriction.Count} restrictions are more than the {clusters - 1} that {clusters} clusters can test together.");
        if (Statistic(test.Restriction, restricted) is not { } statistic)
            return Refuse("What clusters contribute to the score does not span what is tested, so that nothing tells how they vary.");
        var (p, error) = statistic.PValue(multipliers, work.Threads);
        var (interval, reason) = test.IsSingle ? Interval(test, multipliers, cluster) : (null, "An interval is made for a single term only.");
        return new ScoreBootstrapFigures(multipliers.Weights, multipliers.Draws, multipliers.IsEnumerated, statistic.Value, p, error, interval, null, reason);
    }

    private ScoreStatistic? Statistic(LinearRestriction restriction, RestrictedFit restricted)
    {
        var at = refitter.At(restricted.Parameters.AsSpan());
        // Away from the maximum minus the Hessian may lose its definiteness; at the estimate it has it, and both estimate the same information under the null.
        var information = FactorOf(at, input.Free.Length) ?? informationAtEstimate.Value;
        return information is null ? null : ScoreStatistic.Of(restriction.Matrix.AsSpan(), information, at.ByCluster, input.Free.Length);
    }

    private static ScaledCholesky? FactorOf(PointScores at, int f) => ScaledCholesky.Factor(at.Information, f, out _);

    /// <summary>
    /// The values that the test does not reject. Each needs a fit of its own with the value held; the same signs are used for all. From the estimate, where p is 1, a side is widened until a
    /// value is rejected and then halved; the end given is the nearest value seen to be rejected. p is a step function, and where it crosses the level more than once this is one of the crossings.
    /// </summary>
    private (Interval? Interval, string? Reason) Interval(TermTest test, ScoreMultipliers multipliers, CovarianceEstimate? cluster)
    {
        var parameter = test.Terms[0].Parameter;
        var place = input.Free.IndexOf(parameter);
        if (cluster?.Matrix is not { } matrix || !(matrix[place, place] > 0)) return (null, "Without a clustered standard error nothing says where its ends may lie.");
        var isNest = input.Kinds[parameter] == ParameterKind.Dissimilarity;
        var estimate = isNest ? Math.Log(input.Estimates[parameter]) : input.Estimates[parameter];
        var error = Math.Sqrt(matrix[place, place]) / (isNest ? input.Estimates[parameter] : 1);
        var low = End(-1);
        if (low.Reason is not null) return (null, low.Reason);
        var high = End(1);
        if (high.Reason is not null) return (null, high.Reason);
        return (isNest ? new Interval(Math.Exp(low.At), Math.Exp(high.At)) : new Interval(low.At, high.At), null);

        (double At, string? Reason) End(int side)
        {
            var step = Math.Min(LongestFirstStep, new ReferenceDistribution(input.Clusters.Length - 1).Critical(settings.Confidence)) * error;
            var (inside, outside) = (estimate, double.NaN);
            var near = input.Estimates;
            var limit = double.NaN;
            for (var i = 0; i < MostSteps && double.IsNaN(outside); i++)
            {
                // Where a value has no maximum of its own, the end is looked for on this side of it.
                var at = double.IsNaN(limit) ? estimate + (side * step) : (inside + limit) / 2;
                if (PValue(at, near) is not { } tried)
                {
                    limit = at;
                    continue;
                }

                if (tried.P <= 1 - settings.Confidence) outside = at;
                else (inside, near) = (at, tried.Parameters);
                if (double.IsNaN(limit)) step *= StepGrowth;
            }

            if (double.IsNaN(outside) && !double.IsNaN(limit)) return (0, NoMaximum);
            if (double.IsNaN(outside))
                return (0, string.Create(
                    CultureInfo.InvariantCulture,
                    $"No value {(side < 0 ? "below" : "above")} the estimate is rejected, as far as {(isNest ? Math.Exp(inside) : inside):G4}: with so few clusters the interval has no end there."));
            while (Math.Abs(outside - inside) > Closeness * error)
            {
                var at = (inside + outside) / 2;
                if (PValue(at, near) is not { } tried) return (0, NoMaximum);
                if (tried.P <= 1 - settings.Confidence) outside = at;
                else (inside, near) = (at, tried.Parameters);
            }

            return (outside, null);
        }

        (double P, ImmutableArray<double> Parameters)? PValue(double value, ImmutableArray<double> near)
        {
            var restriction = test.Restriction with { Values = [value] };
            var fit = refitter.FitNear(restriction, near.AsSpan());
            if (fit.Failure is not null || Statistic(restriction, fit) is not { } statistic) return null;
            return (statistic.PValue(multipliers, work.Threads).P, fit.Parameters);
        }
    }
}
