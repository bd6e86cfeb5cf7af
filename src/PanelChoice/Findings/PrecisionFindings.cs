using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Inference;
using PanelChoice.Study;

namespace PanelChoice.Findings;

/// <summary>How far pooled standard errors overstate precision, and what the honest ones rest on.</summary>
internal static class PrecisionFindings
{
    // A cluster whose removal moves an estimate by more than one standard error deserves a look (Belsley, Kuh and Welsch 1980, "Regression
    // Diagnostics", the size-free rule for scaled changes; quoted from memory).
    private const double LargeChange = 1;

    // Below this many the clustered standard error with t(G - 1) missed in 8 percent of panels against a nominal 5, with 20 clusters in 12 (pooled logit, a term
    // held by a fifth of the persons; simulations made for this project).
    private const int FewClusters = 40;

    // 27.6 percent of 1,500 simulated independent panels of 15 persons (simulations made for this project).
    private const string FewPersonsByChance = "with 15 persons a ratio above 1.2 shows up by chance in a quarter of panels that are independent";

    public static IEnumerable<Finding> Of(FindingsInput input)
    {
        if (!input.HasErrors) yield break;
        var inference = input.Inference;
        var ratios = inference.Parameters
            .Where(p => p.SeRatio is { } r && double.IsFinite(r))
            .Select(p => (Parameter: input.Layout.Parameters[p.Parameter], Ratio: p.SeRatio!.Value, p.EquivalentOccasions))
            .ToList();
        if (ratios.Count == 0)
        {
            foreach (var finding in Refusals(inference, input.Study.Inference.SecondCluster is not null)) yield return finding;
            yield break;
        }

        foreach (var habit in ratios.Where(r => r.Parameter.Role == CovariateRole.PastChoice))
            yield return new Finding(
                "precision.habit", FindingTopic.Precision, FindingSeverity.Information,
                $"The clustered standard error of '{habit.Parameter.Label}' is {PlainNumber.Ratio(habit.Ratio)} times the pooled one"
                + (habit.EquivalentOccasions is { } worth && habit.Ratio > 1
                    ? $": for this term {PlainNumber.Counted(input.Model.Design.Situations, "occasion")} are worth about {PlainNumber.Count(worth)} independent ones."
                    : "."),
                [new FindingFigure(habit.Parameter.Label, habit.Ratio)]);

        var median = Median(ratios.Select(r => r.Ratio));
        var largest = ratios.MaxBy(r => r.Ratio);
        var reading = input.IsCrossSection
            ? "With one occasion each there are no ties between occasions: a ratio far from 1 speaks of probabilities that the model does not get right."
            : $"This describes; the test is the detector: {FewPersonsByChance}.";
        yield return new Finding(
            "precision.overall", FindingTopic.Precision, FindingSeverity.Information,
            $"Over all terms the clustered standard error is {PlainNumber.Ratio(median)} times the pooled one in the median and at most "
            + $"{PlainNumber.Ratio(largest.Ratio)} times ('{largest.Parameter.Label}'). {reading}",
            [new FindingFigure("median", median), new FindingFigure("largest", largest.Ratio)]);

        List<double> jackknife = [.. inference.Parameters.Where(p => p.JackknifeSeRatio is not null).Select(p => p.JackknifeSeRatio!.Value)];
        if (jackknife.Count > 0)
            yield return new Finding(
                "precision.jackknife", FindingTopic.Precision, FindingSeverity.Information,
                $"With {inference.Clusters.Count} clusters the jackknife is the better yardstick: its standard error is "
                + $"{PlainNumber.Ratio(Median(jackknife))} times the pooled one in the median and at most {PlainNumber.Ratio(jackknife.Max())} times.",
                [new FindingFigure("median", Median(jackknife)), new FindingFigure("largest", jackknife.Max())]);

        foreach (var finding in Few(input, inference)) yield return finding;
        foreach (var finding in Influence(input, inference)) yield return finding;
        foreach (var finding in Refusals(inference, input.Study.Inference.SecondCluster is not null)) yield return finding;
    }

    /// <summary>Terms that rest on few clusters although there are many, or on a small part of the few there are.</summary>
    private static IEnumerable<Finding> Few(FindingsInput input, InferenceResult inference)
    {
        if (input.IsCrossSection) yield break;
        var count = inference.Clusters.Count;
        // With fewer effective clusters than these the clustered standard error is read like one from so few clusters (Carter, Schnepel and Steigerwald 2017);
        // where few more or fewer there are, what is said is only which terms rest on less than half of them.
        var fewest = Math.Min(FewClusters, count / 2.0);
        var few = inference.Parameters.Where(p => p.Leverage is { } l && l.Effective < fewest).OrderBy(p => p.Leverage!.Effective).ToList();
        if (few.Count == 0) yield break;
        var shown = few.Take(3).Select(p => $"'{input.Layout.Parameters[p.Parameter].Label}' on about {PlainNumber.Count(p.Leverage!.Effective)}");
        yield return new Finding(
            "precision.few_drive", FindingTopic.Precision, FindingSeverity.Notice,
            $"Not every term rests on all {PlainNumber.Count(count)} clusters: {string.Join(", ", shown)}"
            + (few.Count > 3 ? $" and {few.Count - 3} more." : ".")
            + " There the clustered standard error tends to be too small, as with so few clusters; the bias-reduced one with its own degrees of freedom allows for it.",
            [.. few.Select(p => new FindingFigure(input.Layout.Parameters[p.Parameter].Label, p.Leverage!.Effective))]);
    }

    private static IEnumerable<Finding> Influence(FindingsInput input, InferenceResult inference)
    {
        var strongest = (from i in inference.Clusters.MostInfluential
                         let se = input.Figures(i.Parameter, CovarianceKind.Cluster)?.StandardError
                         where se > 0
                         select (i.Cluster, i.Parameter, Scaled: Math.Abs(i.Change) / se.Value)).OrderByDescending(x => x.Scaled).ToList();
        if (strongest.Count == 0 || strongest[0].Scaled < LargeChange) yield break;
        var (cluster, parameter, scaled) = strongest[0];
        yield return new Finding(
            "precision.influential", FindingTopic.Precision, FindingSeverity.Notice,
            $"Without {inference.Clusters.By} {inference.Clusters.Names[cluster]} the estimate of '{input.Layout.Parameters[parameter].Label}' would move by {PlainNumber.Ratio(scaled)} "
            + $"clustered standard errors{(inference.Clusters.InfluenceFrom == JackknifeKind.OneStep ? " (by one Newton step)" : "")}: look at that record before relying on the term.",
            [new FindingFigure(input.Layout.Parameters[parameter].Label, scaled)]);
    }

    private static IEnumerable<Finding> Refusals(InferenceResult inference, bool asksForTwoWay)
    {
        foreach (var kind in Enum.GetValues<CovarianceKind>())
        {
            if (kind == CovarianceKind.ClusterUncorrected || (kind == CovarianceKind.TwoWay && !asksForTwoWay)) continue;
            // With many clusters nothing hangs on the adjustment for leverage.
            if (kind == CovarianceKind.BiasReduced && inference.Clusters.Count >= FewClusters) continue;
            if (!inference.Covariances.TryGetValue(kind, out var estimate)) continue;
            if (estimate.Refusal is { } reason && (kind != CovarianceKind.Bootstrap || inference.Bootstrap is not null)
                && (kind != CovarianceKind.Jackknife || inference.Jackknife is not null))
                yield return new Finding("precision.refused", FindingTopic.Precision, FindingSeverity.Warning, Sentence(kind, reason), []);
        }
    }

    private static string Sentence(CovarianceKind kind, string reason) =>
        $"There is no {InWords(kind)} standard error: {reason.TrimEnd('.')}.";

    internal static string InWords(CovarianceKind kind) => kind switch
    {
        CovarianceKind.OuterProduct => "outer-product",
        CovarianceKind.Cluster or CovarianceKind.ClusterUncorrected => "clustered",
        CovarianceKind.TwoWay => "two-way",
        CovarianceKind.BiasReduced => "bias-reduced",
        _ => kind.ToString().ToLowerInvariant(),
    };

    /// <summary>The word that stands for a kind in ids and machine-readable files.</summary>
    internal static string IdOf(CovarianceKind kind) => kind switch
    {
        CovarianceKind.OuterProduct => "outer_product",
        CovarianceKind.ClusterUncorrected => "cluster_uncorrected",
        CovarianceKind.TwoWay => "two_way",
        CovarianceKind.BiasReduced => "bias_reduced",
        _ => kind.ToString().ToLowerInvariant(),
    };

    internal static double Median(IEnumerable<double> values)
    {
        var sorted = values.Order().ToImmutableArray();
        return sorted.Length % 2 == 1 ? sorted[sorted.Length / 2] : 0.5 * (sorted[(sorted.Length / 2) - 1] + sorted[sorted.Length / 2]);
    }
}
