using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>A line of the result's parameter list and where its figures come from.</summary>
/// <param name="Name">Term or nest.</param>
/// <param name="Parameter">Index in the likelihood's layout.</param>
/// <param name="Place">Place among the free parameters; -1 where it is fixed.</param>
/// <param name="Shows">Index of the parameter whose value it shows; -1 for the root's 1.</param>
/// <param name="SameAs">Nest whose parameter it shares; null otherwise.</param>
/// <param name="Standing">How a nest comes by its value; null for coefficients.</param>
internal sealed record ParameterEntry(string Name, int Parameter, int Place, int Shows, string? SameAs, NestStanding? Standing)
{
    /// <summary>Its value in a vector of the layout's parameters.</summary>
    public double Value(ReadOnlySpan<double> parameters) => Shows < 0 ? 1 : parameters[Shows];
}

/// <summary>
/// The result's parameter list: the likelihood's coefficients, then every nest of the study in its order, so that a nest that shares
/// another's parameter stands in the list too, and one that is never wider than one alternative stands there with its parent's value.
/// </summary>
internal static class ParameterEntries
{
    public static ImmutableArray<ParameterEntry> Of(FittedModel model)
    {
        var layout = model.Layout;
        var entries = ImmutableArray.CreateBuilder<ParameterEntry>();
        for (var k = 0; k < layout.Coefficients; k++)
            entries.Add(new ParameterEntry(layout.Parameters[k].Name, k, layout.Free.IndexOf(k), k, null, null));
        foreach (var nest in layout.Nests)
        {
            var owner = layout.Parameters[nest.Parameter].Name;
            entries.Add(new ParameterEntry(
                nest.Name, nest.Parameter, layout.Free.IndexOf(nest.Parameter), Shown(layout, nest), owner == nest.Name ? null : owner, nest.Standing));
        }

        return entries.ToImmutable();
    }

    private const string NoShare = "Without a maximum no cluster has a share in the information.";

    public static ParameterResult Figures(ParameterEntry entry, string path, FittedModel model, InferenceResult inference, ReasonBook book)
    {
        var parameter = model.Layout.Parameters[entry.Parameter];
        var figures = entry.Place < 0 ? null : inference.Parameters.FirstOrDefault(p => p.Parameter == entry.Parameter);
        return new ParameterResult(
            entry.Name,
            entry.Standing is null ? parameter.Alternative : null,
            parameter.Kind == ParameterKind.Coefficient ? ParameterResult.Coefficient : ParameterResult.Dissimilarity,
            entry.Place < 0 ? "fixed" : "free",
            entry.SameAs,
            entry.Standing is null ? RoleWord(parameter.Role) : null,
            book.Number($"{path}.estimate", entry.Value(model.Parameters.AsSpan()), "The search left the range of finite numbers."),
            new StandardErrorsByKind(
                Error("pooled", CovarianceKind.Pooled), Error("outer_product", CovarianceKind.OuterProduct), Error("robust", CovarianceKind.Robust),
                Error("cluster", CovarianceKind.Cluster), Error("jackknife", CovarianceKind.Jackknife), Error("two_way", CovarianceKind.TwoWay),
                Error("bootstrap", CovarianceKind.Bootstrap))
            {
                BiasReduced = Error("bias_reduced", CovarianceKind.BiasReduced),
            },
            new IntervalsByKind(
                Range("pooled", CovarianceKind.Pooled), Range("robust", CovarianceKind.Robust), Range("cluster", CovarianceKind.Cluster),
                Range("jackknife", CovarianceKind.Jackknife), Range("two_way", CovarianceKind.TwoWay), Range("bootstrap", CovarianceKind.Bootstrap),
                book.Interval($"{path}.interval.bootstrap_percentile", figures?.BootstrapPercentile, figures?.PercentileReason ?? Missing(CovarianceKind.Bootstrap)))
            {
                BootstrapAccelerated = book.Interval(
                    $"{path}.interval.bootstrap_bca", figures?.BootstrapAccelerated, figures?.AcceleratedReason ?? Missing(CovarianceKind.Bootstrap)),
                BootstrapStudentised = book.Interval(
                    $"{path}.interval.bootstrap_t", figures?.BootstrapStudentised, figures?.StudentisedReason ?? Missing(CovarianceKind.Bootstrap)),
                BiasReduced = Range("bias_reduced", CovarianceKind.BiasReduced),
            },
            new PValuesByKind(
                PValue("pooled", CovarianceKind.Pooled), PValue("robust", CovarianceKind.Robust), PValue("cluster", CovarianceKind.Cluster),
                PValue("jackknife", CovarianceKind.Jackknife), PValue("two_way", CovarianceKind.TwoWay), PValue("bootstrap", CovarianceKind.Bootstrap))
            {
                BiasReduced = PValue("bias_reduced", CovarianceKind.BiasReduced),
            },
            book.Number($"{path}.bootstrap_error", figures?.BootstrapError, Missing(CovarianceKind.Bootstrap)),
            book.Number($"{path}.se_ratio", figures?.SeRatio, figures?.RatioReason ?? Missing(CovarianceKind.Cluster)),
            book.Number($"{path}.equivalent_occasions", figures?.EquivalentOccasions, figures?.RatioReason ?? Missing(CovarianceKind.Cluster)))
        {
            BootstrapErrors = new BootstrapErrors(
                book.Number($"{path}.bootstrap_errors.se", figures?.BootstrapErrors?.StandardError, Missing(CovarianceKind.Bootstrap)),
                book.Interval($"{path}.bootstrap_errors.percentile", figures?.BootstrapErrors?.Percentile, figures?.PercentileReason ?? Missing(CovarianceKind.Bootstrap)),
                book.Interval($"{path}.bootstrap_errors.bca", figures?.BootstrapErrors?.Accelerated, figures?.AcceleratedReason ?? Missing(CovarianceKind.Bootstrap)),
                book.Interval($"{path}.bootstrap_errors.t", figures?.BootstrapErrors?.Studentised, figures?.StudentisedReason ?? Missing(CovarianceKind.Bootstrap))),
            Degrees = new DegreesByKind(
                Degrees("cluster", CovarianceKind.Cluster), Degrees("jackknife", CovarianceKind.Jackknife), Degrees("two_way", CovarianceKind.TwoWay),
                Degrees("bias_reduced", CovarianceKind.BiasReduced), Degrees("bootstrap", CovarianceKind.Bootstrap)),
            EffectiveClusters = book.Number($"{path}.effective_clusters", figures?.Leverage?.Effective, FixedReason(entry) ?? NoShare),
            PartialLeverage = Leverage(),
            Influence = Influence(),
        };

        double? Degrees(string name, CovarianceKind kind) => book.Number($"{path}.degrees_of_freedom.{name}", Of(kind)?.DegreesOfFreedom, Missing(kind));

        PartialLeverageResult? Leverage()
        {
            if (figures?.Leverage is { } leverage)
                return new PartialLeverageResult(
                    book.Number($"{path}.partial_leverage.largest", leverage.Largest, NoShare),
                    book.Number($"{path}.partial_leverage.spread", leverage.Spread, "There is one cluster only."));
            book.Note($"{path}.partial_leverage", FixedReason(entry) ?? NoShare);
            return null;
        }

        TermInfluenceResult? Influence()
        {
            if (figures?.MostInfluential is { } most) return new TermInfluenceResult(most.Change, $"{inference.Clusters.By} {inference.Clusters.Names[most.Cluster]}");
            book.Note($"{path}.influence", FixedReason(entry) ?? "No estimate without a single cluster exists.");
            return null;
        }

        double? Error(string name, CovarianceKind kind) => book.Number($"{path}.se.{name}", Of(kind)?.StandardError, Missing(kind));
        Interval? Range(string name, CovarianceKind kind) => book.Interval($"{path}.interval.{name}", Of(kind)?.Interval, Missing(kind));
        double? PValue(string name, CovarianceKind kind) => book.Number($"{path}.p_value.{name}", Of(kind)?.PValue, Missing(kind));
        KindFigures? Of(CovarianceKind kind) => figures?.ByKind.GetValueOrDefault(kind);
        string Missing(CovarianceKind kind) =>
            FixedReason(entry) ?? Of(kind)?.Reason ?? KindReason(kind, inference);
    }

    /// <summary>Why a whole kind of covariance is missing.</summary>
    public static string KindReason(CovarianceKind kind, InferenceResult inference) =>
        inference.Covariances.GetValueOrDefault(kind)?.Refusal ?? "The figure does not exist for this parameter.";

    public static string StatusWord(FitStatus status) => status switch
    {
        FitStatus.Converged => FitSummary.Converged,
        FitStatus.NotIdentified => "not_identified",
        FitStatus.Separated => "separated",
        FitStatus.Boundary => "boundary",
        _ => "stopped",
    };

    private static int Shown(ParameterLayout layout, NestPlace nest)
    {
        if (nest.Standing != NestStanding.NeverWider) return nest.Parameter;
        var above = layout.Nests.FirstOrDefault(n => n.Node == nest.ParentNode);
        return above is null ? -1 : Shown(layout, above);
    }

    private static string? FixedReason(ParameterEntry entry) => entry switch
    {
        { Place: >= 0 } => null,
        { Standing: NestStanding.NeverWider } => "The nest never offers two of its members at once, so its dissimilarity is not identified.",
        _ => "The parameter is fixed by the study.",
    };

    private static string RoleWord(CovariateRole role) => role switch
    {
        CovariateRole.PastConditions => "past_conditions",
        CovariateRole.PastChoice => "past_choice",
        CovariateRole.TasteProxy => "taste_proxy",
        _ => "present",
    };
}
