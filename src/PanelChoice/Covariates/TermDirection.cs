using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>Which way a term looks, and what it therefore tells about the past.</summary>
internal static class TermDirection
{
    /// <summary>Steps back that need the study's rule; null for a term that needs none (also habit stock, past share, first choice).</summary>
    public static int? StepsBack(TermSource source) => source switch
    {
        LastChoiceSource s => s.Back,
        LastNestSource s => s.Back,
        ColumnSource { Moment: Lag m } => m.Back,
        ColumnSource { Moment: Change m } => m.Back,
        ColumnSource { Moment: ChosenThen m } => m.Back,
        _ => null,
    };

    /// <summary>Steps ahead; null for a term that does not look ahead.</summary>
    public static int? StepsAhead(TermSource source) => source is ColumnSource { Moment: Lead m } ? m.Ahead : null;

    /// <summary>Whether a person's first recorded occasion has nothing for the term to look back to.</summary>
    public static bool LooksBack(TermSource source) =>
        StepsBack(source) is not null || source is StockSource or PastShareSource or FirstChoiceSource;

    /// <summary>Whether any of the terms looks back.</summary>
    public static bool AnyLooksBack(ImmutableArray<TermSpecification> terms) => terms.Any(t => LooksBack(t.Source));

    /// <summary>What the term's covariate tells about the past.</summary>
    public static CovariateRole Role(TermSource source) => source switch
    {
        LastChoiceSource or LastNestSource or StockSource => CovariateRole.PastChoice,
        PastShareSource or FirstChoiceSource => CovariateRole.TasteProxy,
        ColumnSource { Moment: Lag or Change or ChosenThen } => CovariateRole.PastConditions,
        _ => CovariateRole.Present,
    };
}
