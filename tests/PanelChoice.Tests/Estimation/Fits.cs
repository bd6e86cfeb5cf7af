using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;

namespace PanelChoice.Tests.Estimation;

/// <summary>Fits of synthetic panels, and ways to change a panel.</summary>
internal static class Fits
{
    public static FittedModel Fit(SyntheticPanel made, int starts = 3, NestedLogitForm form = NestedLogitForm.UtilityScaled) =>
        Fit(made.Design(form), form, starts);

    public static FittedModel Fit(ChoiceDesign design, NestedLogitForm form, int starts) =>
        MaximumLikelihood.Fit(LikelihoodKernel.Create(design, form, 1), form, new EstimateSettings(form, starts, 7), WorkContext.Quiet);

    /// <summary>The panel with one covariate changed.</summary>
    public static SyntheticPanel Change(SyntheticPanel made, int covariate, Func<Covariate, Covariate> change) => made with
    {
        Covariates = made.Covariates with { Covariates = made.Covariates.Covariates.SetItem(covariate, change(made.Covariates.Covariates[covariate])) },
    };

    /// <summary>The panel with one covariate more.</summary>
    public static SyntheticPanel Add(SyntheticPanel made, Covariate covariate) => made with
    {
        Covariates = made.Covariates with { Covariates = made.Covariates.Covariates.Add(covariate) },
    };

    /// <summary>A shared covariate on all alternatives, by used occasion and alternative.</summary>
    public static Covariate Shared(SyntheticPanel made, string term, Func<int, int, double> value)
    {
        var panel = made.Panel;
        var J = panel.Alternatives.Length;
        return new Covariate(
            term, null, [.. Enumerable.Range(0, J)],
            [.. Enumerable.Range(0, panel.Occasions * J).Select(i => panel.Offered[i] ? value(i / J, i % J) : 0)],
            false, CovariateRole.Present, null, null, 90);
    }

    /// <summary>The design of chosen persons in a chosen order, each as often as it is named.</summary>
    public static ChoiceDesign Persons(SyntheticPanel made, int[] persons, NestedLogitForm form = NestedLogitForm.UtilityScaled)
    {
        var panel = made.Panel;
        var J = panel.Alternatives.Length;
        ImmutableArray<int> occasions = [.. persons.SelectMany(p => Enumerable.Range(panel.PersonStart[p], panel.PersonStart[p + 1] - panel.PersonStart[p]))];
        var start = new List<int> { 0 };
        foreach (var p in persons) start.Add(start[^1] + panel.PersonStart[p + 1] - panel.PersonStart[p]);
        ImmutableArray<string> names = [.. persons.Select((p, i) => $"{i}")];
        var other = panel with
        {
            Persons = names,
            PersonStart = [.. start],
            PersonOf = [.. persons.SelectMany((p, i) => Enumerable.Repeat(i, panel.PersonStart[p + 1] - panel.PersonStart[p]))],
            Occasion = [.. occasions.Select(o => panel.Occasion[o])],
            Row = [.. occasions.SelectMany(o => panel.Row.AsSpan(o * J, J).ToArray())],
            Offered = [.. occasions.SelectMany(o => panel.Offered.AsSpan(o * J, J).ToArray())],
            Chosen = [.. occasions.Select(o => panel.Chosen[o])],
            Weight = [.. persons.Select(p => panel.Weight[p])],
            Clusters = names,
            ClusterOf = [.. Enumerable.Range(0, persons.Length)],
        };
        var covariates = made.Covariates with
        {
            Panel = other,
            Used = [.. Enumerable.Range(0, occasions.Length)],
            Covariates =
            [
                .. made.Covariates.Covariates.Select(c => c with
                {
                    Values = c.IsConstant ? [] : [.. occasions.SelectMany(o => c.Values.AsSpan(o * c.Enters.Length, c.Enters.Length).ToArray())],
                }),
            ],
        };
        return ChoiceDesignBuilder.Build(covariates, made.Tree, made.Nests, form);
    }
}
