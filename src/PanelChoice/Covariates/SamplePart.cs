using System.Collections.Immutable;
using PanelChoice.Panels;

namespace PanelChoice.Covariates;

/// <summary>A panel, or a part of one that holds whole persons, with its estimation sample.</summary>
/// <param name="Panel">The recorded occasions.</param>
/// <param name="History">Which lies before which.</param>
/// <param name="Values">What terms are worth there.</param>
/// <param name="Used">Occasions in the estimation sample, ascending.</param>
internal sealed record SamplePart(ChoicePanel Panel, OccasionHistory History, TermValues Values, ImmutableArray<int> Used);
