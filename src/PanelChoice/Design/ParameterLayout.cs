using System.Collections.Immutable;
using PanelChoice.Covariates;

namespace PanelChoice.Design;

/// <summary>What a parameter is.</summary>
public enum ParameterKind
{
    /// <summary>A coefficient of utility.</summary>
    Coefficient,

    /// <summary>The dissimilarity of a nest.</summary>
    Dissimilarity,
}

/// <summary>One parameter of the likelihood.</summary>
/// <param name="Name">Term or nest name.</param>
/// <param name="Alternative">Alternative under <c>each</c>; null otherwise.</param>
/// <param name="Kind">Coefficient or dissimilarity.</param>
/// <param name="Fixed">Fixed value; null when free.</param>
/// <param name="Start">Starting value the user gave; null otherwise.</param>
/// <param name="Role">What the covariate tells about the past; <see cref="CovariateRole.Present"/> for dissimilarities.</param>
public sealed record ModelParameter(string Name, string? Alternative, ParameterKind Kind, double? Fixed, double? Start, CovariateRole Role)
{
    /// <summary>The name people read.</summary>
    public string Label => Alternative is null ? Name : $"{Name} [{Alternative}]";

    /// <summary>Whether the parameter is estimated.</summary>
    public bool IsFree => Fixed is null;
}

/// <summary>How a nest comes by its dissimilarity.</summary>
public enum NestStanding
{
    /// <summary>It has a parameter of its own.</summary>
    Own,

    /// <summary>It shares another nest's parameter.</summary>
    Shared,

    /// <summary>The study fixes it.</summary>
    FixedByStudy,

    /// <summary>It is never wider than one offered child, so the parameter is not identified (utility-scaled form only).</summary>
    NeverWider,
}

/// <summary>A nest's place in the parameter list.</summary>
/// <param name="Name">Name of the nest.</param>
/// <param name="Node">Index in the tree's nodes.</param>
/// <param name="Parameter">Index of its parameter.</param>
/// <param name="Standing">How it comes by its value.</param>
/// <param name="ParentNode">Index of the node above.</param>
/// <param name="WideSituations">Situations of the sample in which it had two or more offered children.</param>
public sealed record NestPlace(string Name, int Node, int Parameter, NestStanding Standing, int ParentNode, int WideSituations);

/// <summary>
/// The parameter vector: first the coefficients in the order of the covariates, then one dissimilarity for each nest that does not
/// share another's, in the order of the study. Free and fixed parameters are both in it.
/// </summary>
/// <param name="Parameters">The K parameters.</param>
/// <param name="Coefficients">Number of coefficients; dissimilarities follow.</param>
/// <param name="NodeParameter">Parameter of each inner node of the tree; -1 for the root.</param>
/// <param name="Nests">The nests in the order of the study.</param>
public sealed record ParameterLayout(
    ImmutableArray<ModelParameter> Parameters, int Coefficients, ImmutableArray<int> NodeParameter, ImmutableArray<NestPlace> Nests)
{
    /// <summary>Number of parameters, free and fixed.</summary>
    public int Count => Parameters.Length;

    /// <summary>Indices of the free parameters, ascending.</summary>
    public ImmutableArray<int> Free { get; } = [.. Enumerable.Range(0, Parameters.Length).Where(k => Parameters[k].IsFree)];
}
