using System.Collections.Immutable;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Estimation;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>Kinds of covariance estimate.</summary>
public enum CovarianceKind
{
    /// <summary>H^-1: each occasion independent.</summary>
    Pooled,

    /// <summary>Inverse of the summed outer products of occasion scores: a check on specification.</summary>
    OuterProduct,

    /// <summary>H^-1 (sum s_it s_it') H^-1: every choice by itself (Huber 1967, White 1982).</summary>
    Robust,

    /// <summary>G/(G-1) H^-1 (sum s_g s_g') H^-1 (Liang and Zeger 1986).</summary>
    Cluster,

    /// <summary>The same without G/(G-1).</summary>
    ClusterUncorrected,

    /// <summary>(G-1)/G sum of squared deviations of delete-one-cluster estimates from the full estimate.</summary>
    Jackknife,

    /// <summary>Two-way clustering.</summary>
    TwoWay,

    /// <summary>Covariance of bootstrap replicates.</summary>
    Bootstrap,

    /// <summary>Clustered on scores adjusted for leverage (Bell and McCaffrey 2002), an extension to likelihoods that are not linear.</summary>
    BiasReduced,
}

/// <summary>A covariance estimate, or the reason why there is none.</summary>
/// <param name="Kind">Its kind.</param>
/// <param name="Matrix">
/// F x F over the free parameters, symmetric, in the user's units; NaN in the rows and columns of <paramref name="RefusedParameters"/>; null when
/// refused. Never written to.
/// </param>
/// <param name="Factor">Small-sample factor that is in it; 1 for none.</param>
/// <param name="Clusters">Clusters it rests on; null where none.</param>
/// <param name="DegreesOfFreedom">Degrees of freedom for t; null means the normal distribution.</param>
/// <param name="Cautions">Sentences that belong beside it.</param>
/// <param name="Refusal">Why there is no matrix; null when there is one.</param>
/// <param name="RefusedParameters">Free parameters (by their place among the free ones) for which alone the figure is refused.</param>
public sealed record CovarianceEstimate(
    CovarianceKind Kind, Matrix<double>? Matrix, double Factor, int? Clusters, double? DegreesOfFreedom,
    ImmutableArray<string> Cautions, string? Refusal, ImmutableArray<int> RefusedParameters)
{
    /// <summary>Why each of the <see cref="RefusedParameters"/> is refused, in the same order.</summary>
    public ImmutableArray<string> RefusedReasons { get; init; } = [];

    /// <summary>F variances behind the standard errors, where they are not the diagonal of <see cref="Matrix"/>: those before a repair; empty otherwise.</summary>
    public ImmutableArray<double> Variances { get; init; } = [];

    /// <summary>
    /// F degrees of freedom, term by term (NaN where they do not exist), where they differ between terms; then <see cref="DegreesOfFreedom"/> is the smallest,
    /// for joint tests. Empty otherwise.
    /// </summary>
    public ImmutableArray<double> DegreesByTerm { get; init; } = [];

    /// <summary>Degrees of freedom that a single free parameter is read against; null means the normal distribution, NaN that there are none.</summary>
    /// <param name="place">Its place among the free ones.</param>
    internal double? DegreesOf(int place) => DegreesByTerm.IsEmpty ? DegreesOfFreedom : DegreesByTerm[place];

    /// <summary>Variance behind the standard error of a free parameter.</summary>
    /// <param name="place">Its place among the free ones.</param>
    internal double VarianceOf(int place) => Variances.IsEmpty ? Matrix![place, place] : Variances[place];

    /// <summary>A refusal.</summary>
    internal static CovarianceEstimate Refused(CovarianceKind kind, string reason) => new(kind, null, 1, null, null, [], reason, []);

    /// <summary>An estimate from F x F values, row by row.</summary>
    internal static CovarianceEstimate Of(
        CovarianceKind kind, double[] values, int order, double factor, int? clusters, ImmutableArray<string> cautions) =>
        new(kind, Matrix<double>.Build.DenseOfRowMajor(order, order, values), factor, clusters, clusters - 1, cautions, null, []);
}

/// <summary>An interval.</summary>
/// <param name="Low">Lower end.</param>
/// <param name="High">Upper end.</param>
public sealed record Interval(double Low, double High);

/// <summary>Figures of one free parameter under one kind of covariance.</summary>
/// <param name="StandardError">Standard error; null when it does not exist.</param>
/// <param name="Interval">Interval at the study's confidence; null when it is not given for this kind.</param>
/// <param name="PValue">Two-sided p-value against 0 (coefficients) or the parent's dissimilarity (log scale); null when not given.</param>
/// <param name="Reason">Why a figure is missing; null when none is.</param>
public sealed record KindFigures(double? StandardError, Interval? Interval, double? PValue, string? Reason)
{
    /// <summary>Degrees of freedom of the t distribution behind interval and p-value; null where there are none or the normal distribution is used.</summary>
    public double? DegreesOfFreedom { get; init; }
}

/// <summary>All inference on one free parameter.</summary>
/// <param name="Parameter">Index in the layout.</param>
/// <param name="ByKind">Figures by kind.</param>
/// <param name="BootstrapPercentile">Percentile interval of the replicates; null without bootstrap.</param>
/// <param name="BootstrapError">Monte-Carlo error of the bootstrap standard error; null without bootstrap.</param>
/// <param name="SeRatio">Clustered over pooled standard error: by how much pooling makes it too small.</param>
/// <param name="EquivalentOccasions">Occasions / ratio squared: independent occasions that would be worth as much.</param>
public sealed record ParameterInference(
    int Parameter, ImmutableDictionary<CovarianceKind, KindFigures> ByKind, Interval? BootstrapPercentile, double? BootstrapError,
    double? SeRatio, double? EquivalentOccasions)
{
    /// <summary>
    /// The same ratio from the jackknife, given below 40 clusters, where the clustered standard error itself tends to be too small; null otherwise.
    /// </summary>
    public double? JackknifeSeRatio { get; init; }

    /// <summary>What the shares of the clusters in the information tell of this term; null where nothing has a meaning.</summary>
    public TermLeverage? Leverage { get; init; }

    /// <summary>The cluster that moves this term most; null where no change is known.</summary>
    public Influence? MostInfluential { get; init; }

    /// <summary>Why there is no percentile interval; null when there is one.</summary>
    public string? PercentileReason { get; init; }

    /// <summary>Bias-corrected and accelerated percentile interval; null where there is none.</summary>
    public Interval? BootstrapAccelerated { get; init; }

    /// <summary>Why there is no accelerated interval; null when there is one.</summary>
    public string? AcceleratedReason { get; init; }

    /// <summary>Bootstrap-t interval; null where there is none.</summary>
    public Interval? BootstrapStudentised { get; init; }

    /// <summary>Why there is no bootstrap-t interval; null when there is one.</summary>
    public string? StudentisedReason { get; init; }

    /// <summary>Monte-Carlo errors of the bootstrap's figures; null without bootstrap.</summary>
    public BootstrapErrors? BootstrapErrors { get; init; }

    /// <summary>Why there is no ratio and no equivalent number of occasions; null when there are.</summary>
    public string? RatioReason { get; init; }

    /// <summary>How the ratio was made when sampling weights are in it; null without weights.</summary>
    public string? RatioLabel { get; init; }
}

/// <summary>Monte-Carlo errors: how far bootstrap figures would move under another seed.</summary>
/// <param name="StandardError">Of the standard error, by the replicates' own kurtosis.</param>
/// <param name="Percentile">Of the two ends of the percentile interval; null where there is none.</param>
/// <param name="Accelerated">Of the ends of the accelerated interval; null where there is none.</param>
/// <param name="Studentised">Of the ends of the bootstrap-t interval; null where there is none.</param>
public sealed record BootstrapErrors(double? StandardError, Interval? Percentile, Interval? Accelerated, Interval? Studentised);

/// <summary>How the jackknife went.</summary>
/// <param name="Kind">Full refits or one step.</param>
/// <param name="Refits">Delete-one estimates attempted.</param>
/// <param name="Failures">Of these, failed.</param>
/// <param name="Deviations">
/// G x F deviations from the full estimate, row by row. A row is NaN where the refit failed, an entry where the parameter was not identified
/// without the cluster.
/// </param>
public sealed record JackknifeSummary(JackknifeKind Kind, int Refits, int Failures, ImmutableArray<double> Deviations)
{
    /// <summary>The largest certificate (<see cref="RefitOutcome.Decrement"/>) among the refits that converged; null for the one-step form or where none did.</summary>
    public double? LargestDecrement { get; init; }

    /// <summary>With the one-step form, clusters without which the step does not exist and a full refit was made.</summary>
    public int Refitted { get; init; }
}

/// <summary>Failures of one kind among bootstrap replicates.</summary>
/// <param name="Kind">Kind in plain words.</param>
/// <param name="Count">How many.</param>
/// <param name="Replicates">Their numbers, from 0.</param>
public sealed record ReplicateFailures(string Kind, int Count, ImmutableArray<int> Replicates)
{
    /// <summary>Parameters (indices in the layout) the failures were about, those named most often first; may be empty.</summary>
    public ImmutableArray<int> Parameters { get; init; } = [];
}

/// <summary>A replicate that failed.</summary>
/// <param name="Replicate">Its number, from 0.</param>
/// <param name="Kind">Kind in plain words.</param>
/// <param name="Parameters">Parameters (indices in the layout) it is about; may be empty.</param>
public sealed record FailedReplicate(int Replicate, string Kind, ImmutableArray<int> Parameters);

/// <summary>How the bootstrap went. Nothing is dropped or drawn again: requested = done + failures.</summary>
/// <param name="Requested">Replicates asked for.</param>
/// <param name="Done">Replicates that converged.</param>
/// <param name="Retried">Replicates that needed another start.</param>
/// <param name="Failures">Failures by kind.</param>
/// <param name="Estimates">Requested x K parameters, row by row; NaN rows where a replicate failed.</param>
/// <param name="LogLikelihood">Log-likelihood of each replicate; NaN where it failed.</param>
/// <param name="Status">"converged" or the failure's kind, for each replicate.</param>
public sealed record BootstrapSummary(
    int Requested, int Done, int Retried, ImmutableArray<ReplicateFailures> Failures,
    ImmutableArray<double> Estimates, ImmutableArray<double> LogLikelihood, ImmutableArray<string> Status)
{
    /// <summary>Certificate of each replicate (<see cref="RefitOutcome.Decrement"/>): how far its maximum may still be, in its pooled standard errors; NaN where it failed.</summary>
    public ImmutableArray<double> Decrement { get; init; } = [];

    /// <summary>What is drawn.</summary>
    public BootstrapBlocks Blocks { get; init; }

    /// <summary>Occasions or days in a block; null where whole clusters are drawn.</summary>
    public int? BlockLength { get; init; }

    /// <summary>Whether that length was found from the data.</summary>
    public bool IsLengthAutomatic { get; init; }

    /// <summary>Relative distance that the number of replicates was found for; null where the study states the number.</summary>
    public double? Target { get; init; }

    /// <summary>The replicates that failed, by number.</summary>
    public ImmutableArray<FailedReplicate> Failed { get; init; } = [];

    /// <summary>
    /// F standard errors with the failed replicates in, at their last iterate or, for what their failure names, at the farthest replicate that converged;
    /// empty where fewer than two converged.
    /// </summary>
    public ImmutableArray<double> ErrorsWithFailures { get; init; } = [];

    /// <summary>How the replicates were drawn.</summary>
    public BootstrapDraw Draw { get; init; }

    /// <summary>Requested x F clustered standard errors inside the replicates, row by row; NaN where one does not exist; empty where none was made.</summary>
    public ImmutableArray<double> ClusterErrors { get; init; } = [];

    /// <summary>Why there are no standard errors inside the replicates; null when there are.</summary>
    public string? ClusterErrorsReason { get; init; }
}

/// <summary>How clustering two ways went.</summary>
/// <param name="Second">What the second grouping goes by.</param>
/// <param name="Clusters">Clusters of the first grouping.</param>
/// <param name="SecondClusters">Groups of the second.</param>
/// <param name="Pairs">Pairs of both that hold an occasion.</param>
/// <param name="Negative">Free parameters (by their place) whose variance came out negative before any repair.</param>
/// <param name="Repaired">Whether negative eigenvalues of the matrix were set to 0.</param>
public sealed record TwoWaySummary(string Second, int Clusters, int SecondClusters, int Pairs, ImmutableArray<int> Negative, bool Repaired)
{
    /// <summary>Free parameters (by their place) whose variance in the matrix the repair raised.</summary>
    public ImmutableArray<int> Touched { get; init; } = [];
}

/// <summary>A person or cluster that moves a term.</summary>
/// <param name="Cluster">Index of the cluster.</param>
/// <param name="Parameter">Index in the layout.</param>
/// <param name="Change">Change of the estimate when the cluster is left out, in the user's units.</param>
public sealed record Influence(int Cluster, int Parameter, double Change);

/// <summary>The clusters the figures rest on.</summary>
/// <param name="By">"person" or the cluster column.</param>
/// <param name="Count">Clusters with at least one situation.</param>
/// <param name="Smallest">Smallest number of situations in a cluster.</param>
/// <param name="Median">Median number of situations.</param>
/// <param name="Largest">Largest number of situations.</param>
/// <param name="Effective">Smallest effective number over the free coefficients (Carter, Schnepel and Steigerwald 2017); null where there is none.</param>
/// <param name="DegreesOfFreedom">G - 1.</param>
/// <param name="MostInfluential">Clusters that move terms most, measured in clustered standard errors; empty without jackknife.</param>
public sealed record ClusterSummary(
    string By, int Count, int Smallest, double Median, int Largest, double? Effective, int DegreesOfFreedom, ImmutableArray<Influence> MostInfluential)
{
    /// <summary>Why there is no effective number; null when there is one.</summary>
    public string? EffectiveReason { get; init; }

    /// <summary>Names of the clusters as sentences may give them: stand-ins where ids must not be passed on.</summary>
    public ImmutableArray<string> Names { get; init; } = [];

    /// <summary>Largest leverage tr(H_g H^-1) of a cluster, whose mean is parameters / clusters; null where it has no meaning.</summary>
    public double? LargestLeverage { get; init; }

    /// <summary>Coefficient of variation of the leverages; null where it has no meaning.</summary>
    public double? LeverageSpread { get; init; }

    /// <summary>Coefficient of variation of the numbers of situations; null with one cluster.</summary>
    public double? SizeSpread { get; init; }

    /// <summary>Where changes without a cluster come from: full refits or one Newton step each; null where none are known.</summary>
    public JackknifeKind? InfluenceFrom { get; init; }
}

/// <summary>Everything Inference says about a fitted model.</summary>
/// <param name="Covariances">Every kind, including refused ones.</param>
/// <param name="Parameters">One for each free parameter, in layout order.</param>
/// <param name="Clusters">The clusters.</param>
/// <param name="Jackknife">How the jackknife went; null when off.</param>
/// <param name="Bootstrap">How the bootstrap went; null without replicates.</param>
public sealed record InferenceResult(
    ImmutableDictionary<CovarianceKind, CovarianceEstimate> Covariances, ImmutableArray<ParameterInference> Parameters,
    ClusterSummary Clusters, JackknifeSummary? Jackknife, BootstrapSummary? Bootstrap)
{
    /// <summary>How clustering two ways went; null where it was not asked for or refused.</summary>
    public TwoWaySummary? TwoWay { get; init; }
}
