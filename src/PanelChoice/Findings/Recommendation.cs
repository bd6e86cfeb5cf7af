using PanelChoice.Inference;

namespace PanelChoice.Findings;

/// <summary>Which standard error of a term to report, against which distribution, and why.</summary>
/// <param name="Parameter">The parameter: its index in the layout.</param>
/// <param name="Kind">The kind of standard error; null where none exists.</param>
/// <param name="StandardError">The standard error.</param>
/// <param name="Critical">Half-width of the interval in standard errors (on the log scale for a dissimilarity), at the study's confidence.</param>
/// <param name="DegreesOfFreedom">Degrees of freedom of Student's t; null for the normal distribution.</param>
/// <param name="Interval">The interval.</param>
/// <param name="PValue">Two-sided p-value from the same standard error; null where there is none.</param>
/// <param name="Rule">Id of the rule, for example <c>few_clusters</c>.</param>
/// <param name="Why">The rule in words, with its source.</param>
public sealed record Recommendation(
    int Parameter, CovarianceKind? Kind, double? StandardError, double? Critical, double? DegreesOfFreedom, Interval? Interval, double? PValue, string Rule, string Why);
