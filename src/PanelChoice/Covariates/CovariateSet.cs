using System.Collections.Immutable;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>What a covariate tells about the past; the report and the tests of habit rely on it.</summary>
public enum CovariateRole
{
    /// <summary>Present attributes, constants, means, leads.</summary>
    Present,

    /// <summary>An attribute of an earlier occasion (lag, change, chosen then): yesterday's conditions.</summary>
    PastConditions,

    /// <summary>An earlier choice (last choice, last nest, stock): habit.</summary>
    PastChoice,

    /// <summary>Past share or first choice: stands for lasting taste.</summary>
    TasteProxy,
}

/// <summary>One coefficient's covariate over the estimation sample.</summary>
/// <param name="Term">Name of the term.</param>
/// <param name="Alternative">Name of the alternative under <c>each</c>; null for a coefficient shared by alternatives.</param>
/// <param name="Enters">Indices of the A alternatives whose utility it enters, ascending.</param>
/// <param name="Values">Used occasions x A, occasion by occasion; 0 where not offered. Empty when <paramref name="IsConstant"/>.</param>
/// <param name="IsConstant">The value is 1 wherever it enters.</param>
/// <param name="Role">What it tells about the past.</param>
/// <param name="Fixed">Fixed coefficient; null when estimated.</param>
/// <param name="Start">Starting value; null when not given.</param>
/// <param name="TermIndex">Index of the study's term it was made from.</param>
public sealed record Covariate(
    string Term, string? Alternative, ImmutableArray<int> Enters, ImmutableArray<double> Values, bool IsConstant,
    CovariateRole Role, double? Fixed, double? Start, int TermIndex)
{
    /// <summary>The name people read: the term, and the alternative where there is one.</summary>
    public string Label => Alternative is null ? Term : $"{Term} [{Alternative}]";
}

/// <summary>A reason for which recorded occasions are not in the estimation sample, and how many.</summary>
/// <param name="Reason">The reason in plain words.</param>
/// <param name="Occasions">Number of occasions.</param>
public sealed record LeftOut(string Reason, int Occasions);

/// <summary>How much of a habit stock's arbitrary start value 1/J is still in it.</summary>
/// <param name="Term">Name of the stock term.</param>
/// <param name="WeightAtFirst">Largest remaining weight: at the first used occasion of a person.</param>
/// <param name="WeightAtMedian">Remaining weight at the median used occasion.</param>
public sealed record StockStart(string Term, double WeightAtFirst, double WeightAtMedian);

/// <summary>The covariates on the estimation sample, and the book-keeping of how the sample came about.</summary>
/// <param name="Panel">The recorded panel.</param>
/// <param name="Used">Occasions of the panel that are in the estimation sample, ascending (hence person by person).</param>
/// <param name="Covariates">One for each coefficient, in the order of the study's terms and, under <c>each</c>, of the alternatives.</param>
/// <param name="LeftOut">Occasions left out, by reason; every recorded occasion is either used or in exactly one reason.</param>
/// <param name="StockStarts">Remaining weight of the start value, for each stock term.</param>
/// <param name="Cautions">Warnings that belong to the covariates (lags across gaps, zero-filled attributes, ...).</param>
public sealed record CovariateSet(
    ChoicePanel Panel, ImmutableArray<int> Used, ImmutableArray<Covariate> Covariates, ImmutableArray<LeftOut> LeftOut,
    ImmutableArray<StockStart> StockStarts, ImmutableArray<Caution> Cautions);
