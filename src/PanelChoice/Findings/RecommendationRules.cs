using System.Collections.Immutable;
using PanelChoice.Inference;

namespace PanelChoice.Findings;

/// <summary>
/// The standard error of each term to report, by rules that are tried in order; a rule whose figure does not exist for the term passes on to the next, which
/// then says so. Rates at which intervals miss are those of tests/PanelChoice.Calibration (DEVELOPERS.md, "Standard errors").
/// </summary>
internal static class RecommendationRules
{
    /// <summary>Below this many clusters the clustered standard error with t(G - 1) misses too often; the jackknife does not.</summary>
    public const int SomeClusters = 100;

    /// <summary>One recommendation for each free parameter, in layout order.</summary>
    public static ImmutableArray<Recommendation> Of(FindingsInput input) => [.. input.Inference.Parameters.Select(p => Of(input, p))];

    private static Recommendation Of(FindingsInput input, ParameterInference parameter)
    {
        var missed = "";
        foreach (var rule in Rules(input, parameter))
        {
            if (!rule.Applies) continue;
            if (Figures(parameter, rule.Kind) is { StandardError: { } se, Interval: { } interval } figures)
            {
                var place = input.Layout.Free.IndexOf(parameter.Parameter);
                var df = rule.Kind == CovarianceKind.Robust ? null : input.Inference.Covariances[rule.Kind].DegreesOf(place);
                var critical = new ReferenceDistribution(df).Critical(input.Study.Inference.Confidence);
                return new Recommendation(parameter.Parameter, rule.Kind, se, critical, df, interval, figures.PValue, rule.Id, missed + rule.Why);
            }

            if (rule.Kind == CovarianceKind.Jackknife && IsLost(input, parameter))
                return new Recommendation(
                    parameter.Parameter, null, null, null, null, null, null, "rests_on_one_cluster",
                    $"{Figures(parameter, CovarianceKind.Jackknife)!.Reason} What rests on one {(input.Inference.Clusters.By == "person" ? "person" : "group")} alone "
                    + "has no standard error from how they differ: the clustered one missed the value in about half of such simulated panels.");
            missed += $"There is no {PrecisionFindings.InWords(rule.Kind)} one: {Figures(parameter, rule.Kind)?.Reason ?? "it was not asked for."} ";
        }

        return new Recommendation(
            parameter.Parameter, null, null, null, null, null, null, "none", Figures(parameter, CovarianceKind.Cluster)?.Reason ?? "It has no standard error.");
    }

    /// <summary>The rules in order.</summary>
    private static IEnumerable<Rule> Rules(FindingsInput input, ParameterInference parameter)
    {
        var clusters = input.Inference.Clusters;
        var counted = $"{PlainNumber.Count(clusters.Count)} {(clusters.By == "person" ? "persons" : $"groups of '{clusters.By}'")}";
        yield return new Rule(
            "independent_occasions", CovarianceKind.Robust, input.IsCrossSection,
            "Every person has one occasion, so occasions are the independent units; this one stays right when the probabilities are not exactly those of the model "
            + "(Huber 1967, White 1982).");
        yield return new Rule(
            "common_days", CovarianceKind.TwoWay, input.Diagnostics.CommonDays == true && IsWider(parameter, CovarianceKind.TwoWay, CovarianceKind.Jackknife),
            "People are moved by the same days, which clusters of persons alone do not see (Cameron, Gelbach and Miller 2011), and this one is the wider.");
        yield return new Rule(
            "some_clusters", CovarianceKind.Jackknife, clusters.Count < SomeClusters,
            $"With {counted}, fewer than {SomeClusters}, the clustered standard error tends to be too small and the jackknife much less (MacKinnon, Nielsen and Webb 2023).");
        yield return new Rule(
            "some_clusters_no_refits", CovarianceKind.BiasReduced, clusters.Count < SomeClusters,
            $"With {counted} the clustered standard error tends to be too small; this one needs no refits and has degrees of freedom of its own (Bell and McCaffrey 2002, here "
            + "carried over to a likelihood that is not linear).");
        yield return new Rule(
            "many_clusters", CovarianceKind.Cluster, clusters.Count > 1,
            $"It rests on {counted} and holds whatever ties the occasions inside one together (Liang and Zeger 1986; Cameron and Miller 2015); the pooled one holds only "
            + "where nothing does.");
    }

    /// <summary>Whether the term alone has no jackknife: without some cluster it cannot be estimated.</summary>
    private static bool IsLost(FindingsInput input, ParameterInference parameter) =>
        input.Inference.Covariances.GetValueOrDefault(CovarianceKind.Jackknife) is { Matrix: not null } jackknife
        && jackknife.RefusedParameters.Contains(input.Layout.Free.IndexOf(parameter.Parameter));

    /// <summary>Whether one kind's interval is the wider, or the other does not exist. With few persons or few days the two-way one can be far too narrow.</summary>
    private static bool IsWider(ParameterInference parameter, CovarianceKind kind, CovarianceKind than) =>
        Figures(parameter, than)?.Interval is not { } other || (Figures(parameter, kind)?.Interval is { } one && one.High - one.Low > other.High - other.Low);

    private static KindFigures? Figures(ParameterInference parameter, CovarianceKind kind) => parameter.ByKind.GetValueOrDefault(kind);

    private sealed record Rule(string Id, CovarianceKind Kind, bool Applies, string Why);
}
