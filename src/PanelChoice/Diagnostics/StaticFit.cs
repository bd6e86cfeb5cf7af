using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// The fit on which the cause of dependence is judged: the same sample without last_choice, last_nest, stock, past_share, first_choice and
/// chosen_then (attribute lags stay), person means added, unweighted.
/// </summary>
/// <param name="Model">The fit; null when there is none.</param>
/// <param name="Reason">Why there is none; null otherwise.</param>
/// <param name="Means">Names of the means in it.</param>
/// <param name="LeftOut">Names of the means left out as collinear.</param>
internal sealed record StaticFit(FittedModel? Model, string? Reason, ImmutableArray<string> Means, ImmutableArray<string> LeftOut)
{
    /// <summary>More starts than this add nothing to a fit that is only looked at for residuals.</summary>
    private const int MostStarts = 3;

    /// <summary>Whether a term tells of past choices.</summary>
    public static bool IsPastChoice(TermSpecification term) =>
        term.Source is LastChoiceSource or LastNestSource or StockSource or PastShareSource or FirstChoiceSource
            or ColumnSource { Moment: ChosenThen };

    /// <summary>Fits it.</summary>
    /// <param name="study">The study.</param>
    /// <param name="covariates">The covariates of the user's model: panel and sample.</param>
    /// <param name="model">The user's model: tree and form.</param>
    /// <param name="work">Threads, progress, cancellation.</param>
    public static StaticFit Of(StudySpecification study, CovariateSet covariates, FittedModel model, WorkContext work)
    {
        var tree = model.Design.Tree;
        ImmutableArray<TermSpecification> terms = [.. study.Terms.Where(t => !IsPastChoice(t))];
        if (terms.IsEmpty) return None("the model has no term besides past choices");
        if (CovariateBuilder.BuildOn(study, covariates.Panel, tree, terms, covariates.Used).Value is not { } plain)
            return None("the covariates could not be built without past choices");

        var means = PersonMeans.TermsFor(terms, plain);
        if (With(means) is null) means = [.. means.Where(m => With([m]) is not null)];
        if (!means.IsEmpty && With(means) is { } all)
        {
            var (set, leftOut) = PersonMeans.WithoutCollinear(all, plain.Covariates.Length);
            var withMeans = Fit(study, set, model, work);
            if (withMeans.Status == FitStatus.Converged)
                return new StaticFit(withMeans, null, [.. set.Covariates.Skip(plain.Covariates.Length).Select(c => c.Label)], leftOut);
        }

        var without = Fit(study, plain, model, work);
        return without.Status == FitStatus.Converged
            ? new StaticFit(without, null, [], [.. means.Select(m => m.Name)])
            : None("the model without past choices did not converge");

        CovariateSet? With(ImmutableArray<TermSpecification> added) =>
            CovariateBuilder.BuildOn(study, covariates.Panel, tree, [.. terms, .. added], covariates.Used).Value;
    }

    /// <summary>A design with every person counted once.</summary>
    public static ChoiceDesign Unweighted(ChoiceDesign design) =>
        design with { PersonWeight = [.. Enumerable.Repeat(1.0, design.Persons)] };

    private static FittedModel Fit(StudySpecification study, CovariateSet set, FittedModel model, WorkContext work)
    {
        var design = Unweighted(ChoiceDesignBuilder.Build(set, model.Design.Tree, study.Nests, model.Form));
        var settings = study.Estimate with { Form = model.Form, Starts = Math.Min(MostStarts, study.Estimate.Starts) };
        return MaximumLikelihood.Fit(LikelihoodKernel.Create(design, model.Form, work.Threads), model.Form, settings, work);
    }

    private static StaticFit None(string reason) => new(null, reason, [], []);
}
