using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Findings;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>
/// Everything a run came to: the mirror of <c>result.json</c>, field by field. There is no time, duration, host or thread count in it, so
/// that equal inputs give equal bytes. Figures that do not exist are null and have their entry in <paramref name="Reasons"/>.
/// </summary>
/// <param name="Title">Title of the study; empty when none was given.</param>
/// <param name="Tool">What computed it.</param>
/// <param name="Inputs">What it was computed from.</param>
/// <param name="Settings">Settings that a reader needs beside the figures.</param>
/// <param name="Reasons">Why a figure is null, for each one.</param>
/// <param name="Warnings">What changes how the figures may be read.</param>
/// <param name="Sample">Book-keeping of the estimation sample.</param>
/// <param name="Fit">How the estimation went.</param>
/// <param name="Parameters">One for each coefficient and one for each nest, in the study's order.</param>
/// <param name="Bootstrap">How the bootstrap went.</param>
/// <param name="Jackknife">How the jackknife went; null when there is none.</param>
/// <param name="Covariance">The covariance matrices over <paramref name="Parameters"/>.</param>
/// <param name="Clusters">The clusters.</param>
/// <param name="Diagnostics">The independence battery.</param>
/// <param name="Findings">What was found, in words.</param>
/// <param name="Replicates">The bootstrap replicates; not in result.json but in replicates.parquet.</param>
public sealed record AnalysisResult(
    string Title,
    ToolStamp Tool,
    InputStamps Inputs,
    RunSettings Settings,
    ImmutableArray<MissingFigure> Reasons,
    ImmutableArray<ResultWarning> Warnings,
    SampleSummary Sample,
    FitSummary Fit,
    ImmutableArray<ParameterResult> Parameters,
    BootstrapCounts Bootstrap,
    JackknifeCounts? Jackknife,
    CovarianceMatrices Covariance,
    ClusterResult Clusters,
    DiagnosticsResult Diagnostics,
    ImmutableArray<Finding> Findings,
    ReplicateTable Replicates)
{
    /// <summary>What to report of each free parameter, and why.</summary>
    public ImmutableArray<RecommendationResult> Recommendations { get; init; } = [];

    /// <summary>How clustering two ways went; null where it was not asked for or refused.</summary>
    public TwoWayResult? TwoWay { get; init; }

    /// <summary>Name and version of the document's layout.</summary>
    public const string Schema = "panelchoice-result/1";

    /// <summary>Tests of terms.</summary>
    public ImmutableArray<TermTestResult> Tests { get; init; } = [];

    /// <summary>Nests against utility maximisation.</summary>
    public ImmutableArray<NestConsistency> UtilityMaximisation { get; init; } = [];

    /// <summary>Whether the estimate may be trusted: it converged at an interior maximum with every parameter identified.</summary>
    public bool IsTrusted => Fit.Status == FitSummary.Converged;

    /// <summary>Whether dependence was flagged.</summary>
    public bool IsDependenceFlagged => Diagnostics.Verdict == Verdict.Dependence;
}

/// <summary>What computed a result.</summary>
/// <param name="Version">Version of the program.</param>
/// <param name="Runtime">Runtime, for example ".NET 10.0.1".</param>
/// <param name="Kernel">Likelihood kernel: bits are promised per kernel.</param>
public sealed record ToolStamp(string Version, string Runtime, string Kernel);

/// <summary>A file and its hash.</summary>
/// <param name="File">Name of the study file without its folder; the data file as the study writes it.</param>
/// <param name="Sha256">Lower-case hexadecimal SHA-256 of its bytes.</param>
public sealed record FileStamp(string File, string Sha256);

/// <summary>What a result was computed from.</summary>
/// <param name="Study">The study file.</param>
/// <param name="Data">The data file.</param>
public sealed record InputStamps(FileStamp Study, FileStamp Data);

/// <summary>Settings that a reader needs beside the figures.</summary>
/// <param name="Confidence">Confidence level of intervals.</param>
/// <param name="EstimateSeed">Seed of the starting points.</param>
/// <param name="BootstrapSeed">Seed of the bootstrap.</param>
/// <param name="DiagnosticsSeed">Seed of the detector's draws.</param>
public sealed record RunSettings(double Confidence, long EstimateSeed, long BootstrapSeed, long DiagnosticsSeed);

/// <summary>Why a figure is null.</summary>
/// <param name="Path">Its place in the document, for example <c>parameters[3].se.two_way</c>; a place covers what lies below it.</param>
/// <param name="Reason">The reason in plain words.</param>
public sealed record MissingFigure(string Path, string Reason);

/// <summary>Something that changes how the figures may be read.</summary>
/// <param name="Id">Stable id.</param>
/// <param name="Sentence">In plain words.</param>
public sealed record ResultWarning(string Id, string Sentence);

/// <summary>Book-keeping of the estimation sample.</summary>
/// <param name="RowsRead">Rows of the data file.</param>
/// <param name="PersonsRead">Persons recorded.</param>
/// <param name="OccasionsRead">Occasions recorded.</param>
/// <param name="LeftOut">Occasions left out, by reason.</param>
/// <param name="Persons">Persons used.</param>
/// <param name="Occasions">Occasions used.</param>
/// <param name="Alternatives">The alternatives over the occasions used.</param>
public sealed record SampleSummary(
    long RowsRead, int PersonsRead, int OccasionsRead, ImmutableArray<LeftOutCount> LeftOut, int Persons, int Occasions,
    ImmutableArray<AlternativeCount> Alternatives)
{
    /// <summary>The book-keeping of an estimation sample.</summary>
    /// <param name="sample">The sample.</param>
    public static SampleSummary Of(EstimationSample sample)
    {
        ArgumentNullException.ThrowIfNull(sample);
        return new SampleSummary(
            sample.Rows, sample.RecordedPersons, sample.RecordedOccasions, [.. sample.LeftOut.Select(l => new LeftOutCount(l.Reason, l.Occasions))],
            sample.Persons, sample.Occasions, [.. sample.Alternatives.Select(a => new AlternativeCount(a.Name, a.Offered, a.Chosen))]);
    }
}

/// <summary>Occasions left out for one reason.</summary>
/// <param name="Reason">The reason in plain words.</param>
/// <param name="Occasions">How many.</param>
public sealed record LeftOutCount(string Reason, int Occasions);

/// <summary>How often an alternative was offered and chosen in the sample.</summary>
/// <param name="Name">The alternative.</param>
/// <param name="Offered">Occasions on which it was offered.</param>
/// <param name="Chosen">Occasions on which it was chosen.</param>
public sealed record AlternativeCount(string Name, int Offered, int Chosen);

/// <summary>How the estimation went.</summary>
/// <param name="Status">"converged", "not_identified", "separated", "boundary" or "stopped".</param>
/// <param name="Form">"utility-scaled" or "unscaled".</param>
/// <param name="LogLikelihood">Log-likelihood at the estimate.</param>
/// <param name="LogLikelihoodEqualProbability">With every offered alternative equally likely.</param>
/// <param name="LogLikelihoodConstants">With constants alone; null where that maximum does not exist.</param>
/// <param name="FreeParameters">Parameters estimated.</param>
/// <param name="GradientNorm">Largest scaled gradient at the estimate; null where it does not exist.</param>
/// <param name="Iterations">Iterations of the winning start.</param>
/// <param name="Starts">The starts.</param>
/// <param name="Warnings">What the user must know about the fit.</param>
public sealed record FitSummary(
    string Status, string Form, double? LogLikelihood, double? LogLikelihoodEqualProbability, double? LogLikelihoodConstants, int FreeParameters,
    double? GradientNorm, int Iterations, StartCounts Starts, ImmutableArray<FitWarning> Warnings)
{
    /// <summary>The status of an estimate that may be trusted.</summary>
    public const string Converged = "converged";
}

/// <summary>The starts and the maxima they led to.</summary>
/// <param name="Requested">Starts asked for.</param>
/// <param name="Converged">Starts that converged.</param>
/// <param name="Optima">Distinct maxima, best first.</param>
public sealed record StartCounts(int Requested, int Converged, ImmutableArray<OptimumCount> Optima);

/// <summary>A distinct maximum.</summary>
/// <param name="LogLikelihood">Its log-likelihood.</param>
/// <param name="Starts">Starts that ended there.</param>
public sealed record OptimumCount(double LogLikelihood, int Starts);

/// <summary>Something the user must know about the fit.</summary>
/// <param name="Id">Stable id.</param>
/// <param name="Sentence">In plain words.</param>
/// <param name="Parameters">Labels of the parameters it is about.</param>
public sealed record FitWarning(string Id, string Sentence, ImmutableArray<string> Parameters);

/// <summary>How the bootstrap went.</summary>
/// <param name="Requested">Replicates asked for; 0 for none.</param>
/// <param name="Done">Replicates that converged.</param>
/// <param name="Retried">Replicates that needed another start.</param>
/// <param name="Failed">Failures by kind.</param>
public sealed record BootstrapCounts(int Requested, int Done, int Retried, ImmutableArray<FailureCount> Failed)
{
    /// <summary>What is drawn: "clusters", "clusters_exponential", "moving" or "calendar"; null without replicates.</summary>
    public string? Scheme { get; init; }

    /// <summary>Occasions or days in a block; null where whole clusters are drawn.</summary>
    public int? BlockLength { get; init; }

    /// <summary>Whether that length was found from the data; null where whole clusters are drawn.</summary>
    public bool? IsLengthAutomatic { get; init; }

    /// <summary>Relative distance for which the number of replicates was found; null where the study states the number.</summary>
    public double? Target { get; init; }

    /// <summary>Probability with which standard errors are as near as the target says; null without a target.</summary>
    public double? TargetCoverage { get; init; }

    /// <summary>The replicates that failed, by number.</summary>
    public ImmutableArray<FailedReplicateResult> Failures { get; init; } = [];

    /// <summary>Standard errors with the failed replicates in, in the order of the parameters; null where one does not exist.</summary>
    public ImmutableArray<double?>? ErrorsWithFailures { get; init; }
}

/// <summary>A replicate that failed.</summary>
/// <param name="Replicate">Its number, from 0.</param>
/// <param name="Kind">Kind in plain words.</param>
/// <param name="Parameters">Labels of the parameters it is about; may be empty.</param>
public sealed record FailedReplicateResult(int Replicate, string Kind, ImmutableArray<string> Parameters);

/// <summary>Failures of one kind.</summary>
/// <param name="Kind">Kind in plain words.</param>
/// <param name="Count">How many.</param>
public sealed record FailureCount(string Kind, int Count);

/// <summary>How the jackknife went.</summary>
/// <param name="Kind">"refit" or "one_step".</param>
/// <param name="Refits">Delete-one estimates attempted.</param>
/// <param name="Failures">Of these, failed.</param>
public sealed record JackknifeCounts(string Kind, int Refits, int Failures)
{
    /// <summary>How far from its maximum any of the refits may be, in its own pooled standard errors; null where nothing was refitted.</summary>
    public double? LargestDecrement { get; init; }

    /// <summary>With the one-step form, clusters without which the step does not exist and a full refit was made; with refits all of them.</summary>
    public int Refitted { get; init; }
}

/// <summary>The clusters the figures rest on.</summary>
/// <param name="By">"person" or the cluster column.</param>
/// <param name="Count">Clusters with an occasion in the sample.</param>
/// <param name="Effective">Smallest effective number over the free coefficients (Carter, Schnepel and Steigerwald 2017); null where there is none.</param>
/// <param name="Smallest">Smallest number of occasions.</param>
/// <param name="Median">Median number.</param>
/// <param name="Largest">Largest number.</param>
/// <param name="DegreesOfFreedom">G - 1.</param>
/// <param name="MostInfluential">Clusters that move terms most, under pseudonyms unless ids were asked for.</param>
public sealed record ClusterResult(
    string By, int Count, double? Effective, int Smallest, double Median, int Largest, int DegreesOfFreedom,
    ImmutableArray<InfluenceResult> MostInfluential)
{
    /// <summary>Largest leverage of a cluster, whose mean is free parameters / clusters; null where there is none.</summary>
    public double? LargestLeverage { get; init; }

    /// <summary>Coefficient of variation of the leverages; null where there is none.</summary>
    public double? LeverageSpread { get; init; }

    /// <summary>Coefficient of variation of the numbers of occasions; null with one cluster.</summary>
    public double? SizeSpread { get; init; }

    /// <summary>Where changes without a cluster come from: "refit" or "one_step"; null where none are known.</summary>
    public string? InfluenceFrom { get; init; }
}

/// <summary>A cluster that moves a term.</summary>
/// <param name="Person">The person or cluster, under its pseudonym unless ids were asked for.</param>
/// <param name="Term">Label of the parameter.</param>
/// <param name="Change">Change of the estimate when the cluster is left out.</param>
public sealed record InfluenceResult(string Person, string Term, double Change);
