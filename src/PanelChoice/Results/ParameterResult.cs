using System.Collections.Immutable;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>A coefficient or a nest's dissimilarity with all its figures.</summary>
/// <param name="Name">Name of the term or nest.</param>
/// <param name="Alternative">Alternative under <c>each</c>; null otherwise.</param>
/// <param name="Kind">"coefficient" or "dissimilarity".</param>
/// <param name="Status">"free" or "fixed".</param>
/// <param name="SameAs">For a nest that shares another's parameter, that nest; null otherwise.</param>
/// <param name="Role">"present", "past_conditions", "past_choice" or "taste_proxy"; null for a dissimilarity.</param>
/// <param name="Estimate">The estimate, or the fixed value.</param>
/// <param name="StandardErrors">Standard errors by kind.</param>
/// <param name="Intervals">Intervals by kind.</param>
/// <param name="PValues">Two-sided p-values by kind.</param>
/// <param name="BootstrapError">Monte-Carlo error of the bootstrap standard error.</param>
/// <param name="SeRatio">Clustered over pooled standard error.</param>
/// <param name="EquivalentOccasions">Independent occasions that would be worth as much.</param>
public sealed record ParameterResult(
    string Name, string? Alternative, string Kind, string Status, string? SameAs, string? Role, double? Estimate,
    StandardErrorsByKind StandardErrors, IntervalsByKind Intervals, PValuesByKind PValues, double? BootstrapError, double? SeRatio, double? EquivalentOccasions)
{
    /// <summary>Monte-Carlo errors of the bootstrap's figures.</summary>
    public BootstrapErrors BootstrapErrors { get; init; } = new(null, null, null, null);

    /// <summary>The kind of a utility coefficient.</summary>
    public const string Coefficient = "coefficient";

    /// <summary>The kind of a nest's parameter.</summary>
    public const string Dissimilarity = "dissimilarity";

    /// <summary>The name people read.</summary>
    public string Label => Alternative is null ? Name : $"{Name} [{Alternative}]";

    /// <summary>Whether it was estimated.</summary>
    public bool IsFree => Status == "free";
}

/// <summary>Standard errors of one parameter; null where one does not exist.</summary>
/// <param name="Pooled">Each occasion independent.</param>
/// <param name="OuterProduct">From outer products of scores.</param>
/// <param name="Robust">Every occasion by itself.</param>
/// <param name="Cluster">Clustered.</param>
/// <param name="Jackknife">Delete one cluster.</param>
/// <param name="TwoWay">Two-way clustered.</param>
/// <param name="Bootstrap">Bootstrap.</param>
public sealed record StandardErrorsByKind(
    double? Pooled, double? OuterProduct, double? Robust, double? Cluster, double? Jackknife, double? TwoWay, double? Bootstrap);

/// <summary>Intervals of one parameter; null where one does not exist.</summary>
/// <param name="Pooled">Normal.</param>
/// <param name="Robust">Normal.</param>
/// <param name="Cluster">t(G - 1).</param>
/// <param name="Jackknife">t(G - 1).</param>
/// <param name="TwoWay">t(min G - 1).</param>
/// <param name="Bootstrap">t(G - 1) with the bootstrap standard error.</param>
/// <param name="BootstrapPercentile">Percentiles of the replicates.</param>
public sealed record IntervalsByKind(
    Interval? Pooled, Interval? Robust, Interval? Cluster, Interval? Jackknife, Interval? TwoWay, Interval? Bootstrap, Interval? BootstrapPercentile)
{
    /// <summary>Bias-corrected and accelerated percentiles of the replicates.</summary>
    public Interval? BootstrapAccelerated { get; init; }

    /// <summary>Bootstrap-t.</summary>
    public Interval? BootstrapStudentised { get; init; }
}

/// <summary>Two-sided p-values of one parameter; null where one does not exist.</summary>
/// <param name="Pooled">Normal.</param>
/// <param name="Robust">Normal.</param>
/// <param name="Cluster">t(G - 1).</param>
/// <param name="Jackknife">t(G - 1).</param>
/// <param name="TwoWay">t(min G - 1).</param>
/// <param name="Bootstrap">t(G - 1).</param>
public sealed record PValuesByKind(double? Pooled, double? Robust, double? Cluster, double? Jackknife, double? TwoWay, double? Bootstrap);

/// <summary>
/// The covariance matrices, each square and symmetric over the result's parameters in their order (rows of fixed parameters are 0), or null.
/// </summary>
/// <param name="Pooled">Each occasion independent.</param>
/// <param name="OuterProduct">From outer products of scores.</param>
/// <param name="Robust">Every occasion by itself.</param>
/// <param name="Cluster">Clustered.</param>
/// <param name="ClusterUncorrected">Clustered, without G/(G - 1).</param>
/// <param name="Jackknife">Delete one cluster.</param>
/// <param name="TwoWay">Two-way clustered.</param>
/// <param name="Bootstrap">Bootstrap.</param>
public sealed record CovarianceMatrices(
    SquareMatrix? Pooled, SquareMatrix? OuterProduct, SquareMatrix? Robust, SquareMatrix? Cluster, SquareMatrix? ClusterUncorrected,
    SquareMatrix? Jackknife, SquareMatrix? TwoWay, SquareMatrix? Bootstrap);

/// <summary>A square matrix, row by row; a cell that does not exist is NaN.</summary>
/// <param name="Order">Rows and columns.</param>
/// <param name="Values">Order x Order values.</param>
public sealed record SquareMatrix(int Order, ImmutableArray<double> Values)
{
    /// <summary>One cell.</summary>
    /// <param name="row">Row.</param>
    /// <param name="column">Column.</param>
    public double this[int row, int column] => Values[(row * Order) + column];
}

/// <summary>The bootstrap replicates: one row for each replicate asked for.</summary>
/// <param name="Labels">Distinct column names of the parameters, in the result's order.</param>
/// <param name="Status">"converged", or the kind of failure.</param>
/// <param name="LogLikelihood">Log-likelihood; NaN where the replicate failed.</param>
/// <param name="Estimates">Replicates x parameters, row by row; NaN where the replicate failed.</param>
public sealed record ReplicateTable(
    ImmutableArray<string> Labels, ImmutableArray<string> Status, ImmutableArray<double> LogLikelihood, ImmutableArray<double> Estimates)
{
    /// <summary>
    /// Newton decrement at the end of each replicate, or a bound on it: how far its maximum may still be, in the replicate's own pooled standard
    /// errors; NaN where the replicate failed.
    /// </summary>
    public ImmutableArray<double> Decrement { get; init; } = [];

    /// <summary>Labels of what each replicate's failure is about, separated by semicolons; empty where it converged or nothing is named.</summary>
    public ImmutableArray<string> FailedParameters { get; init; } = [];
}
