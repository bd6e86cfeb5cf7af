using System.Collections.Immutable;
using System.Text.Json;
using PanelChoice.Design;
using PanelChoice.Findings;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>What to report of a free parameter, and why.</summary>
/// <param name="Name">Name of the term or nest.</param>
/// <param name="Alternative">Alternative under <c>each</c>; null otherwise.</param>
/// <param name="Kind">The kind of standard error, as its keys in the document are called; null where none exists.</param>
/// <param name="StandardError">The standard error.</param>
/// <param name="Critical">Half-width of the interval in standard errors (on the log scale for a dissimilarity).</param>
/// <param name="DegreesOfFreedom">Degrees of freedom of Student's t; null for the normal distribution.</param>
/// <param name="Interval">The interval.</param>
/// <param name="PValue">Two-sided p-value.</param>
/// <param name="Rule">Id of the rule.</param>
/// <param name="Why">The rule in words.</param>
public sealed record RecommendationResult(
    string Name, string? Alternative, string? Kind, double? StandardError, double? Critical, double? DegreesOfFreedom, Interval? Interval, double? PValue,
    string Rule, string Why)
{
    /// <summary>The results of recommendations on a model's parameters.</summary>
    internal static ImmutableArray<RecommendationResult> Of(ImmutableArray<Recommendation> recommendations, ParameterLayout layout) =>
    [
        .. recommendations.Select(r => new RecommendationResult(
            layout.Parameters[r.Parameter].Name, layout.Parameters[r.Parameter].Alternative, r.Kind is { } kind ? JsonWords.Of(kind) : null, r.StandardError, r.Critical,
            r.DegreesOfFreedom, r.Interval, r.PValue, r.Rule, r.Why)),
    ];

    /// <summary>Writes them. What is null here is so by the rule that is named.</summary>
    internal static void Write(Utf8JsonWriter json, ImmutableArray<RecommendationResult> recommendations) =>
        json.WriteArray("recommendations", recommendations, r => json.WriteObject(() =>
        {
            json.WriteString("name", r.Name);
            json.WriteString("alternative", r.Alternative);
            json.WriteString("kind", r.Kind);
            json.WriteFigure("se", r.StandardError);
            json.WriteFigure("critical", r.Critical);
            json.WriteFigure("degrees_of_freedom", r.DegreesOfFreedom);
            ResultJson.WriteInterval(json, "interval", r.Interval);
            json.WriteFigure("p_value", r.PValue);
            json.WriteString("rule", r.Rule);
            json.WriteString("why", r.Why);
        }));
}
