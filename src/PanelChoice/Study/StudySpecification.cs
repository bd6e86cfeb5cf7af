using System.Collections.Immutable;

namespace PanelChoice.Study;

/// <summary>A study file after parsing and validation: everything the user asked for, nothing about the data yet.</summary>
/// <param name="Title">Title of the study; empty when none was given.</param>
/// <param name="File">The study file's name as the user gave it.</param>
/// <param name="Text">The study file's whole text, kept so that a report can show it.</param>
/// <param name="Sha256">Lower-case hexadecimal SHA-256 of the file's bytes.</param>
/// <param name="Panel">Where the data are and which column is which.</param>
/// <param name="History">How a term looks back.</param>
/// <param name="Nests">The nests, in the order of the file.</param>
/// <param name="Terms">The terms of utility, in the order of the file.</param>
/// <param name="Estimate">Form of the likelihood, starts, seed.</param>
/// <param name="Inference">Clusters, confidence, jackknife, bootstrap.</param>
/// <param name="Diagnostics">Lags, level, draws, seed of the battery.</param>
public sealed record StudySpecification(
    string Title,
    string File,
    string Text,
    string Sha256,
    PanelSource Panel,
    HistorySpecification History,
    ImmutableArray<NestSpecification> Nests,
    ImmutableArray<TermSpecification> Terms,
    EstimateSettings Estimate,
    InferenceSettings Inference,
    DiagnosticsSettings Diagnostics)
{
    /// <summary>The tests of terms, in the order of the file.</summary>
    public ImmutableArray<TestSpecification> Tests { get; init; } = [];
}

/// <summary>The data file and the columns that identify its rows (long layout: a row per person, occasion and alternative).</summary>
/// <param name="File">Data file as the study file writes it.</param>
/// <param name="FullPath">The same file, absolute.</param>
/// <param name="Person">Column of the person's id.</param>
/// <param name="Occasion">Column of the occasion; null when each person has one.</param>
/// <param name="Alternative">Column of the alternative's name.</param>
/// <param name="Chosen">Column that is 1 (or true) on the chosen row.</param>
/// <param name="Offered">Column that is 0 (or false) where the alternative was not available; null when all rows were.</param>
/// <param name="Weight">Column of the sampling weight; null without weights.</param>
/// <param name="SharedCalendar">Whether the same occasion is the same day for everybody; null when not stated.</param>
public sealed record PanelSource(
    string File, string FullPath, string Person, string? Occasion, string Alternative, string Chosen,
    string? Offered, string? Weight, bool? SharedCalendar);

/// <summary>Which earlier occasion is the previous one.</summary>
public enum PreviousRule
{
    /// <summary>The person's previous recorded occasion, whatever the gap.</summary>
    Recorded,

    /// <summary>Exactly the occasion numbered one less (whole numbers).</summary>
    Step,

    /// <summary>Exactly one calendar day earlier (dates).</summary>
    Day,

    /// <summary>The working day before: Saturdays, Sundays and listed holidays are skipped (dates).</summary>
    Workday,

    /// <summary>Exactly seven days earlier (dates).</summary>
    Week,
}

/// <summary>What happens to an occasion whose history is missing.</summary>
public enum MissingHistory
{
    /// <summary>The occasion leaves the estimation sample; it still serves as history.</summary>
    Drop,

    /// <summary>The covariate that lacks its history is 0.</summary>
    Zero,
}

/// <summary>How terms look back.</summary>
/// <param name="Previous">The rule; null when no term needs one.</param>
/// <param name="Holidays">Dates that <see cref="PreviousRule.Workday"/> skips besides week-ends.</param>
/// <param name="LongestGap">With <see cref="PreviousRule.Recorded"/>: further back (days, or units of occasion) counts as no history.</param>
/// <param name="WithoutHistory">What to do where history is missing.</param>
public sealed record HistorySpecification(
    PreviousRule? Previous, ImmutableArray<DateOnly> Holidays, int? LongestGap, MissingHistory WithoutHistory);

/// <summary>A nest as the user wrote it.</summary>
/// <param name="Name">Name of the nest.</param>
/// <param name="Members">Alternatives or other nests.</param>
/// <param name="Dissimilarity">Fixed value; null when estimated or shared.</param>
/// <param name="SameAs">Nest whose parameter this one shares; null when it has its own.</param>
/// <param name="Line">Line of the study file.</param>
public sealed record NestSpecification(string Name, ImmutableArray<string> Members, double? Dissimilarity, string? SameAs, int Line);

/// <summary>A term of utility as the user wrote it; <c>levels</c> are not expanded yet, because their number depends on the data.</summary>
/// <param name="Name">Name of the term.</param>
/// <param name="Source">Where its value comes from.</param>
/// <param name="Alternatives">Alternatives it enters; empty means all.</param>
/// <param name="Each">One coefficient per alternative (except <paramref name="Base"/>) instead of one for all.</param>
/// <param name="Base">The alternative left without a coefficient under <paramref name="Each"/>.</param>
/// <param name="Times">Column whose value at the present occasion multiplies the term.</param>
/// <param name="Log">Natural logarithm of the column, taken first.</param>
/// <param name="Scale">Factor applied last; 1 when not given.</param>
/// <param name="Fixed">Fixed coefficient; null when estimated.</param>
/// <param name="Start">Starting value; null when not given.</param>
/// <param name="Line">Line of the study file.</param>
public sealed record TermSpecification(
    string Name, TermSource Source, ImmutableArray<string> Alternatives, bool Each, string? Base, string? Times,
    bool Log, double Scale, double? Fixed, double? Start, int Line);

/// <summary>Where a term's value comes from.</summary>
public abstract record TermSource
{
    private protected TermSource()
    {
    }
}

/// <summary>A numeric column, or a text column turned into indicators.</summary>
/// <param name="Column">Name of the column.</param>
/// <param name="Moment">At which occasion it is read.</param>
/// <param name="Is">Text value that counts as 1; null for numeric columns and for <paramref name="Levels"/>.</param>
/// <param name="Levels">One indicator for each text value but <paramref name="Omit"/>.</param>
/// <param name="Omit">The value left out under <paramref name="Levels"/>.</param>
public sealed record ColumnSource(string Column, ColumnMoment Moment, string? Is, bool Levels, string? Omit) : TermSource;

/// <summary>The constant 1.</summary>
public sealed record ConstantSource : TermSource;

/// <summary>1 for the alternative chosen <paramref name="Back"/> occasions ago.</summary>
/// <param name="Back">How many occasions back, 1 or more.</param>
public sealed record LastChoiceSource(int Back) : TermSource;

/// <summary>1 for every alternative whose own nest holds the choice of <paramref name="Back"/> occasions ago.</summary>
/// <param name="Back">How many occasions back, 1 or more.</param>
public sealed record LastNestSource(int Back) : TermSource;

/// <summary>Habit stock: exponential smoothing of the person's past choices (Guadagni and Little 1983).</summary>
/// <param name="Retention">Share of the stock kept from one recorded occasion to the next, inside (0, 1).</param>
public sealed record StockSource(double Retention) : TermSource;

/// <summary>Share of the person's earlier recorded occasions on which this alternative was chosen.</summary>
public sealed record PastShareSource : TermSource;

/// <summary>1 for the alternative chosen at the person's first recorded occasion.</summary>
public sealed record FirstChoiceSource : TermSource;

/// <summary>The occasion at which a column is read.</summary>
public abstract record ColumnMoment
{
    private protected ColumnMoment()
    {
    }
}

/// <summary>The present occasion.</summary>
public sealed record Now : ColumnMoment;

/// <summary>The same alternative's value <paramref name="Back"/> occasions ago.</summary>
/// <param name="Back">How many occasions back, 1 or more.</param>
public sealed record Lag(int Back) : ColumnMoment;

/// <summary>The same alternative's value <paramref name="Ahead"/> occasions later.</summary>
/// <param name="Ahead">How many occasions ahead, 1 or more.</param>
public sealed record Lead(int Ahead) : ColumnMoment;

/// <summary>The present value minus the value <paramref name="Back"/> occasions ago.</summary>
/// <param name="Back">How many occasions back, 1 or more.</param>
public sealed record Change(int Back) : ColumnMoment;

/// <summary>Mean over the person's occasions in the estimation sample on which the alternative was offered.</summary>
public sealed record PersonMean : ColumnMoment;

/// <summary>The attribute that the chosen alternative had <paramref name="Back"/> occasions ago, on that alternative; 0 elsewhere.</summary>
/// <param name="Back">How many occasions back, 1 or more.</param>
public sealed record ChosenThen(int Back) : ColumnMoment;

/// <summary>Where the dissimilarity sits in the likelihood.</summary>
public enum NestedLogitForm
{
    /// <summary>Root scale 1: a coefficient means the same in every nest. The default.</summary>
    UtilityScaled,

    /// <summary>Utility unscaled inside its nest, nest value l times the log-sum; the form of many published tables.</summary>
    Unscaled,
}

/// <summary>Estimation settings.</summary>
/// <param name="Form">Where the dissimilarity sits.</param>
/// <param name="Starts">Number of starting points; 1 means only from plain logit.</param>
/// <param name="Seed">Seed of the seeded starting points.</param>
public sealed record EstimateSettings(NestedLogitForm Form, int Starts, long Seed);

/// <summary>How the jackknife is computed.</summary>
public enum JackknifeKind
{
    /// <summary>Full refits up to 1,000 clusters, one step beyond.</summary>
    Auto,

    /// <summary>A full refit without each cluster.</summary>
    Refit,

    /// <summary>One Newton step without each cluster, labelled so.</summary>
    OneStep,

    /// <summary>None.</summary>
    Off,
}

/// <summary>How a bootstrap replicate weighs the clusters.</summary>
public enum BootstrapDraw
{
    /// <summary>As many clusters as there are, drawn with replacement.</summary>
    Counts,

    /// <summary>Exponential weights of mean 1: no cluster ever leaves the sample.</summary>
    Exponential,
}

/// <summary>What a bootstrap replicate draws.</summary>
public enum BootstrapBlocks
{
    /// <summary>Whole clusters.</summary>
    Cluster,

    /// <summary>Runs of consecutive occasions inside each person.</summary>
    Moving,

    /// <summary>Runs of consecutive days, for all persons together.</summary>
    Calendar,
}

/// <summary>Inference settings.</summary>
/// <param name="Cluster">"person", or a column that is constant within a person.</param>
/// <param name="Confidence">Confidence level of intervals, inside (0, 1).</param>
/// <param name="Jackknife">How the jackknife is computed.</param>
/// <param name="Replicates">Bootstrap replicates; 0 for none; without meaning where <see cref="Target"/> finds their number.</param>
/// <param name="BootstrapSeed">Seed of the bootstrap.</param>
public sealed record InferenceSettings(string Cluster, double Confidence, JackknifeKind Jackknife, int Replicates, long BootstrapSeed)
{
    /// <summary>
    /// The second grouping of two-way clustering: "occasion", "person", or a column that is constant within a choice situation; null for clusters one way.
    /// </summary>
    public string? SecondCluster { get; init; }

    /// <summary>Draws of the score bootstrap; 0 for none; null leaves it to the number of clusters.</summary>
    public int? ScoreDraws { get; init; }

    /// <summary>How a replicate weighs the clusters.</summary>
    public BootstrapDraw Draw { get; init; }

    /// <summary>What a replicate draws.</summary>
    public BootstrapBlocks Blocks { get; init; }

    /// <summary>Occasions or days in a block; null: found from the data.</summary>
    public int? BlockLength { get; init; }

    /// <summary>
    /// Relative distance of standard errors from those of infinitely many replicates, for which their number is found; null where the study states the number.
    /// </summary>
    public double? Target { get; init; }

    /// <summary>Whether bootstrap-t intervals are made; null: where they cost little.</summary>
    public bool? Studentised { get; init; }
}

/// <summary>Settings of the independence battery.</summary>
/// <param name="Lags">Number of lags shown.</param>
/// <param name="Level">Significance level of the verdict.</param>
/// <param name="Draws">Draws for the detector's p-value.</param>
/// <param name="Seed">Seed of those draws.</param>
public sealed record DiagnosticsSettings(int Lags, double Level, int Draws, long Seed);
