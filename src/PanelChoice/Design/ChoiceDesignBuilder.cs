using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Study;

namespace PanelChoice.Design;

/// <summary>Lays covariates out for the kernels and settles which parameters are free.</summary>
public static class ChoiceDesignBuilder
{
    /// <summary>Builds the design of a covariate set under a nest tree.</summary>
    /// <param name="covariates">Covariates on the estimation sample; every used occasion offers two or more alternatives.</param>
    /// <param name="tree">The nest tree over the panel's alternatives, in the panel's order.</param>
    /// <param name="nests">The study's nests, which give the order of the dissimilarities; same names as in the tree.</param>
    /// <param name="form">The form: a nest that is never wider than one child has no parameter in the utility-scaled one.</param>
    /// <exception cref="ArgumentException">The tree is over other alternatives than the panel.</exception>
    public static ChoiceDesign Build(CovariateSet covariates, NestTree tree, ImmutableArray<NestSpecification> nests, NestedLogitForm form)
    {
        ArgumentNullException.ThrowIfNull(covariates);
        ArgumentNullException.ThrowIfNull(tree);
        var panel = covariates.Panel;
        if (!tree.Alternatives.SequenceEqual(panel.Alternatives))
            throw new ArgumentException("The nest tree and the panel name different alternatives.", nameof(tree));

        var survey = new DesignSurvey(tree);
        survey.Add(covariates, 0);
        var plan = DesignPlan.Of(survey, covariates.Covariates, _ => true, tree, nests, form, panel.ClusterBy, panel.Clusters);
        var store = new MemoryBlockStore(plan.Format);
        new DesignFiller(plan, store).Add(covariates);
        return plan.On(store);
    }
}
