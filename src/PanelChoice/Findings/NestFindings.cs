using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Study;

namespace PanelChoice.Findings;

/// <summary>
/// Which alternatives replace which. In the utility-scaled form a nest is consistent with utility maximisation for all data where its
/// dissimilarity is at most its parent's and that at most 1 (McFadden 1981); in the unscaled form each is relative to the node above, so
/// that every one must be at most 1.
/// </summary>
internal static class NestFindings
{
    public static IEnumerable<Finding> Of(FindingsInput input)
    {
        if (input.Layout.Nests.IsEmpty)
        {
            yield return new Finding(
                "nests.none", FindingTopic.Nests, FindingSeverity.Information,
                "The study groups no alternatives, so this is plain logit: every alternative draws from all others in proportion to their shares.", []);
            yield break;
        }

        foreach (var nest in input.Layout.Nests)
        {
            yield return Describe(input, nest);
            if (input.UtilityMaximisation.FirstOrDefault(n => n.Nest == nest.Name) is { Globally: false, Locally: { } locally }) yield return Nearby(nest, locally);
        }

        if (input.Model.Form == NestedLogitForm.Unscaled)
            yield return new Finding(
                "nests.unscaled", FindingTopic.Nests, FindingSeverity.Notice,
                "In the unscaled form a coefficient means the same in two nests only where their dissimilarities are equal.", []);
    }

    private static Finding Describe(FindingsInput input, NestPlace nest)
    {
        var value = input.Model.Parameters[nest.Parameter];
        var parent = ParentValue(input, nest, out var parentName);
        var members = string.Join(", ", input.Study.Nests.First(n => n.Name == nest.Name).Members);
        var head = $"'{nest.Name}' ({members}): ";
        ImmutableArray<FindingFigure> figures = [new(nest.Name, value), new("limit", parent)];
        switch (nest.Standing)
        {
            case NestStanding.NeverWider:
                return new Finding(
                    "nests.never_wider", FindingTopic.Nests, FindingSeverity.Notice,
                    head + $"never offers two of its members at once, so its dissimilarity cannot be estimated; it is shown at {parentName}.",
                    figures);
            case NestStanding.FixedByStudy:
                return Judged(
                    input, nest, head + $"dissimilarity fixed at {PlainNumber.Rounded(value, null)} by the study.", value, parent, parentName, tested: false, figures);
            // Where the search found no maximum, the place at which it stood is no estimate to judge a nest by.
            case NestStanding.Own or NestStanding.Shared when input.Model.Status != FitStatus.Converged:
                return new Finding(
                    "nests.no_estimate", FindingTopic.Nests, FindingSeverity.Notice,
                    head + $"no estimate of its dissimilarity; the search stood at {PlainNumber.Rounded(value, null)} when it ended.", figures);
            case NestStanding.Shared:
                return Judged(
                    input, nest, head + $"shares the dissimilarity of '{input.Layout.Parameters[nest.Parameter].Name}', {input.WithInterval(nest.Parameter)}.",
                    value, parent, parentName, tested: true, figures);
            // Only the unscaled form can estimate it: there the dissimilarity of a nest of one is a scale of its own.
            case NestStanding.Own when nest.WideSituations == 0:
                return new Finding(
                    "nests.single", FindingTopic.Nests, FindingSeverity.Information,
                    head + $"dissimilarity {input.WithInterval(nest.Parameter)}. It never offers two of its members at once: in the unscaled form its value "
                    + "is a scale for the utility of what is in it.",
                    figures);
            default:
                return Judged(
                    input, nest, head + $"dissimilarity {input.WithInterval(nest.Parameter)}.", value, parent, parentName, tested: true, figures);
        }
    }

    private static Finding Judged(
        FindingsInput input, NestPlace nest, string head, double value, double parent, string parentName, bool tested, ImmutableArray<FindingFigure> figures)
    {
        var p = tested ? input.Figures(nest.Parameter, input.Quoted)?.PValue : null;
        var test = p is { } known ? $" (two-sided test against it: {PlainNumber.PValueInWords(known)}, {input.QuotedInWords})" : "";
        if (p is { } tail) figures = figures.Add(new FindingFigure("p against the limit", tail));
        // Identity up to rounding: a value shared with the parent or fixed at it is neither above nor below.
        if (Math.Abs(value - parent) <= 1e-12)
            return new Finding(
                "nests.dissolved", FindingTopic.Nests, FindingSeverity.Information, $"{head} It equals {parentName}, so the nest changes nothing.", figures);
        var certain = p < 1 - input.Study.Inference.Confidence;
        if (value < parent && parent > 1)
            return new Finding(
                "nests.below_parent", FindingTopic.Nests, FindingSeverity.Notice,
                $"{head} It lies below {parentName}{test}; but that lies above 1, and what is said of it holds for this nest as well.", figures);
        if (value < parent)
            return new Finding(
                "nests.consistent", FindingTopic.Nests, FindingSeverity.Information,
                $"{head} It lies below {parentName}{test}, which is consistent with utility maximisation"
                + (p is null || certain
                    ? ": its members replace each other more readily than others do."
                    : ", but within error of it: these data do not show that its members replace each other more readily than others do."),
                figures);
        return new Finding(
            certain ? "nests.inconsistent" : "nests.above", FindingTopic.Nests, certain ? FindingSeverity.Warning : FindingSeverity.Notice,
            $"{head} It lies above {parentName}{test}"
            + (certain
                ? ", which is not consistent with utility maximisation for all data: rethink the nest"
                : p is null ? ", which is not consistent with utility maximisation for all data" : ", but within error of it")
            + (tested ? $"; dissimilarity = {PlainNumber.Rounded(parent, null)} in the study file fixes it at the limit." : "."),
            figures);
    }

    /// <summary>What lies outside the range for all data may still be within bounds near the data at hand.</summary>
    private static Finding Nearby(NestPlace nest, LocalConsistency locally) => new(
        "nests.local", FindingTopic.Nests, FindingSeverity.Notice,
        $"'{nest.Name}' may still be consistent near the data at hand: on {PlainNumber.Percent(locally.Share)} of the {PlainNumber.Counted(locally.Occasions, "occasion")} that offer "
        + "two or more of its members, its dissimilarity keeps the first- and second-order bounds of local consistency (Boersch-Supan 1990; Herriges and Kling 1996)"
        + (locally.Share switch
        {
            >= 1 => ": small changes of utility are answered as utility maximisers would.",
            <= 0 => ": nowhere are small changes of utility answered as utility maximisers would.",
            _ => ": on the others even small changes of utility are answered as no utility maximiser would.",
        }),
        [new(nest.Name + ", share within local bounds", locally.Share), new(nest.Name + ", occasions", locally.Occasions)]);

    private static double ParentValue(FindingsInput input, NestPlace nest, out string name)
    {
        var tree = input.Model.Design.Tree;
        if (input.Model.Form == NestedLogitForm.Unscaled || nest.ParentNode == tree.Root)
        {
            name = "1";
            return 1;
        }

        var parent = input.Layout.Nests.First(n => n.Node == nest.ParentNode);
        var value = parent.Standing == NestStanding.NeverWider ? ParentValue(input, parent, out _) : input.Model.Parameters[parent.Parameter];
        name = $"its parent's {PlainNumber.Rounded(value, input.Figures(parent.Parameter, input.Quoted)?.StandardError)} ('{parent.Name}')";
        return value;
    }
}
