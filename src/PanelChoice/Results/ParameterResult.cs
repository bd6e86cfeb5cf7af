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

    /// <summary>Degrees of freedom behind intervals and p-values.</summary>
    public DegreesByKind Degrees { get; init; } = new(null, null, null, null, null);

    /// <summary>Effective number of clusters (Carter, Schnepel and Steigerwald 2017); null where there is none.</summary>
    public double? EffectiveClusters { get; init; }

    /// <summary>Partial leverage; null where there is none.</summary>
    public PartialLeverageResult? PartialLeverage { get; init; }

    /// <summary>The cluster that moves the estimate most; null where no change is known.</summary>
    public TermInfluenceResult? Influence { get; init; }

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
    double? Pooled, double? OuterProduct, double? Robust, double? Cluster, double? Jackknife, double? TwoWay, double? Bootstrap)
{
    /// <summary>Clustered with scores adjusted for leverage.</summary>
    public double? BiasReduced { get; init; }
}

/// <summary>Degrees of freedom by kind; null where there is no figure that is read against t.</summary>
/// <param name="Cluster">G - 1.</param>
/// <param name="Jackknife">G - 1.</param>
/// <param name="TwoWay">min G - 1.</param>
/// <param name="BiasReduced">The term's own (Bell and McCaffrey 2002).</param>
/// <param name="Bootstrap">G - 1.</param>
public sealed record DegreesByKind(double? Cluster, double? Jackknife, double? TwoWay, double? BiasReduced, double? Bootstrap);

/// <summary>How unevenly a term's information is spread over clusters.</summary>
/// <param name="Largest">Largest share of a cluster; 1/G if all were alike.</param>
/// <param name="Spread">Coefficient of variation of the shares; null with one cluster.</param>
public sealed record PartialLeverageResult(double? Largest, double? Spread);

/// <summary>The largest change of an estimate when one cluster is left out.</summary>
/// <param name="Largest">The change.</param>
/// <param name="Person">The cluster, under its pseudonym unless ids were asked for.</param>
public sealed record TermInfluenceResult(double Largest, string Person);

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

    /// <summary>t with the term's own degrees of freedom.</summary>
    public Interval? BiasReduced { get; init; }
}

/// <summary>Two-sided p-values of one parameter; null where one does not exist.</summary>
/// <param name="Pooled">Normal.</param>
/// <param name="Robust">Normal.</param>
/// <param name="Cluster">t(G - 1).</param>
/// <param name="Jackknife">t(G - 1).</param>
/// <param name="TwoWay">t(min G - 1).</param>
/// <param name="Bootstrap">t(G - 1).</param>
public sealed record PValuesByKind(double? Pooled, double? Robust, double? Cluster, double? Jackknife, double? TwoWay, double? Bootstrap)
{
    /// <summary>t with the term's own degrees of freedom.</summary>
    public double? BiasReduced { get; init; }
}

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
    SquareMatrix? Jackknife, SquareMatrix? TwoWay, SquareMatrix? Bootstrap)
{
    /// <summary>Clustered with scores adjusted for leverage.</summary>
    public SquareMatrix? BiasReduced { get; init; }
}

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
