using System.Collections.Immutable;

namespace PanelChoice.Findings;

/// <summary>What a finding is about; a report shows findings topic by topic.</summary>
public enum FindingTopic
{
    /// <summary>Who and what is in the estimation sample.</summary>
    Sample,

    /// <summary>How the estimation ended.</summary>
    Fit,

    /// <summary>How far pooled standard errors overstate precision, and what they rest on.</summary>
    Precision,

    /// <summary>What the past does to the present.</summary>
    Past,

    /// <summary>Which alternatives replace which.</summary>
    Nests,

    /// <summary>Whether one person's occasions look like independent evidence.</summary>
    Independence,

    /// <summary>What to report, and why.</summary>
    Advice,

    /// <summary>What must be said whatever the figures are.</summary>
    Caution,
}

/// <summary>How much a finding should worry the reader.</summary>
public enum FindingSeverity
{
    /// <summary>A result.</summary>
    Information,

    /// <summary>Something to keep in mind when reading the figures.</summary>
    Notice,

    /// <summary>Something that changes what may be concluded.</summary>
    Warning,
}

/// <summary>A number that a finding's sentence rests on, at full precision.</summary>
/// <param name="Name">What the number is.</param>
/// <param name="Value">The number.</param>
public sealed record FindingFigure(string Name, double Value);

/// <summary>Something the run found out, in one or two plain sentences, with the numbers behind it.</summary>
/// <param name="Id">Stable id, for example <c>past.habit</c>; machines and tests rely on it.</param>
/// <param name="Topic">What it is about.</param>
/// <param name="Severity">How much it should worry the reader.</param>
/// <param name="Sentence">The finding in plain words, numbers rounded for people.</param>
/// <param name="Figures">The numbers behind it.</param>
public sealed record Finding(string Id, FindingTopic Topic, FindingSeverity Severity, string Sentence, ImmutableArray<FindingFigure> Figures);
