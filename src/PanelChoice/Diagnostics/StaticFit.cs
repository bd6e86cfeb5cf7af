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

    /// <summary>Fits it.</summary>
    /// <param name="study">The study.</param>
    /// <param name="sample">The sample of the user's model.</param>
    /// <param name="design">The design of the static fit; null where there is none.</param>
    /// <param name="form">The form of the user's model.</param>
    /// <param name="work">Threads, progress, cancellation.</param>
    public static StaticFit Of(StudySpecification study, EstimationSample sample, StaticDesign? design, NestedLogitForm form, WorkContext work)
    {
        if (StaticDesign.TermsOf(study).IsEmpty) return None("the model has no term besides past choices");
        if (design is null) return None("the covariates could not be built without past choices");
        var all = design.Design;
        var plain = StaticDesign.Plain(study, sample);
        if (plain < all.Layout.Coefficients)
        {
            var collinear = PersonMeans.Collinear(all, plain, work.Threads);
            var withMeans = Fit(study, all.Without(collinear), form, work);
            if (withMeans.Status == FitStatus.Converged)
                return new StaticFit(
                    withMeans, null, [.. withMeans.Layout.Parameters[plain..withMeans.Layout.Coefficients].Select(p => p.Label)],
                    [.. collinear.Select(k => all.Layout.Parameters[k].Label)]);
        }

        var without = Fit(study, all.Without(Enumerable.Range(plain, all.Layout.Coefficients - plain).ToHashSet()), form, work);
        return without.Status == FitStatus.Converged
            ? new StaticFit(without, null, [], design.Means)
            : None("the model without past choices did not converge");
    }

    private static FittedModel Fit(StudySpecification study, ChoiceDesign design, NestedLogitForm form, WorkContext work)
    {
        var settings = study.Estimate with { Form = form, Starts = Math.Min(MostStarts, study.Estimate.Starts) };
        return MaximumLikelihood.Fit(LikelihoodKernel.Create(design.Unweighted(), form, work.Threads), form, settings, work);
    }

    private static StaticFit None(string reason) => new(null, reason, [], []);
}
