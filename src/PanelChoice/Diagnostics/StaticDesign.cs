using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// The design on which the cause of dependence is judged: the same sample without last_choice, last_nest, stock, past_share, first_choice and
/// chosen_then (attribute lags stay), person means added. It depends on the study and its data alone, never on a fit.
/// </summary>
/// <param name="Design">The design, the means last among its coefficients.</param>
/// <param name="Means">Names of the mean terms.</param>
internal sealed record StaticDesign(ChoiceDesign Design, ImmutableArray<string> Means)
{
    /// <summary>Whether a term tells of past choices.</summary>
    public static bool IsPastChoice(TermSpecification term) =>
        term.Source is LastChoiceSource or LastNestSource or StockSource or PastShareSource or FirstChoiceSource
            or ColumnSource { Moment: ChosenThen };

    /// <summary>The terms that stay.</summary>
    public static ImmutableArray<TermSpecification> TermsOf(StudySpecification study) => [.. study.Terms.Where(t => !IsPastChoice(t))];

    /// <summary>Builds it; null where no term stays, or the covariates cannot be built.</summary>
    /// <param name="study">The study.</param>
    /// <param name="sample">The sample of the user's model.</param>
    /// <param name="main">The design of the user's model.</param>
    /// <param name="build">Builds the design of other terms on the same sample from the data; null where they do not fit it.</param>
    /// <param name="target">Where a design goes that can be derived from the main one without the data; null where none is to be.</param>
    public static StaticDesign? Of(
        StudySpecification study, EstimationSample sample, ChoiceDesign main, Func<ImmutableArray<TermSpecification>, ChoiceDesign?> build,
        Func<BlockFormat, IBlockTarget>? target = null)
    {
        var terms = TermsOf(study);
        if (terms.IsEmpty) return null;
        var varies = PersonMeans.VaryWithinPersons(main);
        var means = PersonMeans.TermsFor(terms, term => sample.Covariates.Select((c, k) => varies[k] && study.Terms[c.TermIndex] == term).Any(v => v));
        if (target is not null && DerivedDesign.Of(study, sample, main, terms, means, target) is { } derived) return new StaticDesign(derived, Names(means));
        if (build([.. terms, .. means]) is { } all) return new StaticDesign(all, Names(means));
        means = [.. means.Where(m => build([.. terms, m]) is not null)];
        return build([.. terms, .. means]) is { } some ? new StaticDesign(some, Names(means))
            : build(terms) is { } plain ? new StaticDesign(plain, [])
            : null;

        static ImmutableArray<string> Names(ImmutableArray<TermSpecification> means) => [.. means.Select(m => m.Name)];
    }

    /// <summary>Number of coefficients before the means.</summary>
    public static int Plain(StudySpecification study, EstimationSample sample) => sample.Covariates.Count(c => !IsPastChoice(study.Terms[c.TermIndex]));
}
