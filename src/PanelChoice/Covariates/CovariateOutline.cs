using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>The covariates of a whole sample without their values.</summary>
/// <param name="Covariates">One for each coefficient, in order; without values.</param>
/// <param name="AbsentLevels">Names of the indicators that were planned and have no coefficient, because their text value is not in the sample.</param>
/// <param name="LeftOut">Occasions left out, by reason.</param>
/// <param name="StockStarts">Remaining weight of the start value, for each stock term.</param>
/// <param name="Cautions">Warnings that belong to the covariates.</param>
internal sealed record CovariateOutline(
    ImmutableArray<Covariate> Covariates, ImmutableHashSet<string> AbsentLevels, ImmutableArray<LeftOut> LeftOut, ImmutableArray<StockStart> StockStarts,
    ImmutableArray<Caution> Cautions)
{
    /// <summary>Whether a planned covariate has a coefficient.</summary>
    public bool Keeps(Covariate covariate) => !AbsentLevels.Contains(covariate.Term);
}
