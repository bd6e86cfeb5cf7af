using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>How an estimation ended.</summary>
public enum FitStatus
{
    /// <summary>At an interior maximum, all free parameters identified.</summary>
    Converged,

    /// <summary>Some parameters cannot be told from the data; they are named.</summary>
    NotIdentified,

    /// <summary>The likelihood rises without end along a direction of coefficients; it is named.</summary>
    Separated,

    /// <summary>A dissimilarity runs to 0 or without end: there is no interior maximum.</summary>
    Boundary,

    /// <summary>The optimiser stopped before a maximum.</summary>
    Stopped,
}

/// <summary>A distinct maximum found from the starts.</summary>
/// <param name="LogLikelihood">Its log-likelihood.</param>
/// <param name="Starts">How many starts ended there.</param>
/// <param name="Parameters">All K parameters there.</param>
public sealed record Optimum(double LogLikelihood, int Starts, ImmutableArray<double> Parameters);

/// <summary>Something the user must know about the fit: a stable id, one sentence, and the parameters it is about.</summary>
/// <param name="Id">Stable id, for example <c>fit.collinear</c>.</param>
/// <param name="Sentence">The finding in plain words.</param>
/// <param name="Parameters">Indices of the parameters it is about; may be empty.</param>
public sealed record FitFinding(string Id, string Sentence, ImmutableArray<int> Parameters);

/// <summary>A model fitted by full-information maximum likelihood.</summary>
/// <param name="Likelihood">The likelihood it maximises.</param>
/// <param name="Form">Where the dissimilarity sits.</param>
/// <param name="Status">How the estimation ended.</param>
/// <param name="Parameters">All K parameters, free and fixed, in the user's units. Always the best point seen, whatever the status.</param>
/// <param name="LogLikelihood">Weighted log-likelihood there.</param>
/// <param name="LogLikelihoodEqualProbability">With every offered alternative equally likely.</param>
/// <param name="LogLikelihoodConstants">Maximum with alternative-specific constants alone (plain logit); null when it does not exist.</param>
/// <param name="Hessian">K x K second derivatives there, row by row.</param>
/// <param name="GradientNorm">Largest absolute gradient over free parameters, each times the parameter's pooled standard error
/// (weights scaled to mean 1).</param>
/// <param name="Iterations">Iterations of the winning start.</param>
/// <param name="StartsRequested">Starts asked for.</param>
/// <param name="StartsConverged">Starts that converged.</param>
/// <param name="Optima">Distinct maxima, best first.</param>
/// <param name="Findings">What the user must know.</param>
public sealed record FittedModel(
    IChoiceLikelihood Likelihood,
    NestedLogitForm Form,
    FitStatus Status,
    ImmutableArray<double> Parameters,
    double LogLikelihood,
    double LogLikelihoodEqualProbability,
    double? LogLikelihoodConstants,
    ImmutableArray<double> Hessian,
    double GradientNorm,
    int Iterations,
    int StartsRequested,
    int StartsConverged,
    ImmutableArray<Optimum> Optima,
    ImmutableArray<FitFinding> Findings)
{
    /// <summary>Free coefficients that the sample cannot tell; they are held at 0 and the others estimated given that.</summary>
    public ImmutableArray<int> Held { get; init; } = [];

    /// <summary>What the fit learnt of each column by itself, kept for refits; null for a model that was not made by a fit.</summary>
    internal ColumnSurvey? Survey { get; init; }

    /// <summary>The design of the likelihood.</summary>
    public ChoiceDesign Design => Likelihood.Design;

    /// <summary>The parameter layout.</summary>
    public ParameterLayout Layout => Likelihood.Design.Layout;
}
