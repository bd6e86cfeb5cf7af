using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>On how many occasions a nest behaves as utility maximisers would in the neighbourhood of the sample.</summary>
/// <param name="Share">Share of the occasions on which its dissimilarity stays within the local bounds.</param>
/// <param name="Occasions">Occasions on which it offers two or more of its members.</param>
public sealed record LocalConsistency(double Share, int Occasions);

/// <summary>Whether a nest is consistent with utility maximisation: for all data, or near the data at hand.</summary>
/// <param name="Nest">Name of the nest.</param>
/// <param name="Estimate">Its dissimilarity.</param>
/// <param name="Bound">The largest value that is consistent for all data.</param>
/// <param name="Globally">Whether it is within that.</param>
/// <param name="Locally">How often it is within the bounds that hold at single occasions; null where there are none.</param>
/// <param name="Reason">Why there are no local bounds; null when there are.</param>
public sealed record NestConsistency(string Nest, double Estimate, double Bound, bool Globally, LocalConsistency? Locally, string? Reason);

/// <summary>
/// Nests against utility maximisation. For all data it takes l_child at most l_parent at most 1 (McFadden 1981); in the unscaled form l at most 1. Where the utilities stay near those of an
/// occasion less is enough (Boersch-Supan 1990): the mixed derivatives of probabilities by the utilities of members of one nest must have their signs there. The first two orders give
/// <code>
/// l &lt;= 1 / (1 - P)                                        with two members on offer, or more
/// l &lt;= 4 / (3 (1 - P) + sqrt((1 + 7 P)(1 - P)))           with three or more as well
/// </code>
/// with P the probability of the nest (Herriges and Kling 1996; both follow from d log P_j / dV_k = P(k|m) ((1 - 1/l) - P) by differentiating once more, and hold in both forms). Higher
/// orders are not looked at. The bounds are those of nests under the root.
/// </summary>
internal static class UtilityRange
{
    /// <summary>A value shared with its limit differs from it by rounding at most.</summary>
    private const double Rounding = 1e-12;

    /// <summary>Every nest that has a dissimilarity of its own meaning, in the order of the study; empty where there is no estimate to judge.</summary>
    /// <param name="model">The fitted model.</param>
    /// <param name="work">Threads and cancellation; no figure depends on them.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static ImmutableArray<NestConsistency> Of(FittedModel model, WorkContext work)
    {
        if (model.Status != FitStatus.Converged) return [];
        ImmutableArray<NestPlace> nests = [.. model.Layout.Nests.Where(n => n.WideSituations > 0 && n.Standing != NestStanding.NeverWider)];
        ImmutableArray<NestPlace> walked = [.. nests.Where(n => model.Parameters[n.Parameter] > 1 && IsTop(model, n))];
        var within = walked.IsEmpty ? [] : Within(model, walked, work);
        return [.. nests.Select(n => Judge(model, n, walked.IndexOf(n) is >= 0 and var at ? within[at] : null))];
    }

    private static NestConsistency Judge(FittedModel model, NestPlace nest, long? within)
    {
        var value = model.Parameters[nest.Parameter];
        var bound = 1.0;
        if (model.Form == NestedLogitForm.UtilityScaled)
            for (var above = NestAt(model, nest.ParentNode); above is not null; above = NestAt(model, above.ParentNode))
                if (above.Standing != NestStanding.NeverWider) bound = Math.Min(bound, model.Parameters[above.Parameter]);
        var isTop = IsTop(model, nest);
        // Up to 1 both bounds hold whatever the probability.
        var share = within is { } count ? (double)count / nest.WideSituations : 1;
        return new NestConsistency(
            nest.Name, value, bound, value <= bound * (1 + Rounding), isTop ? new LocalConsistency(share, nest.WideSituations) : null,
            isTop ? null : "The bounds for single occasions are known for nests under the root only.");
    }

    private static bool IsTop(FittedModel model, NestPlace nest) => nest.ParentNode == model.Design.Tree.Root;

    private static NestPlace? NestAt(FittedModel model, int node) => model.Layout.Nests.FirstOrDefault(n => n.Node == node);

    /// <summary>The larger bound that a nest must keep at an occasion.</summary>
    /// <param name="p">Its probability.</param>
    /// <param name="offered">How many of its members are on offer.</param>
    internal static double LocalBound(double p, int offered)
    {
        var q = 1 - p;
        if (offered < 2 || q <= 0) return double.PositiveInfinity;
        return offered == 2 ? 1 / q : Math.Min(1 / q, 4 / ((3 * q) + Math.Sqrt((1 + (7 * p)) * q)));
    }

    /// <summary>Occasions on which each of some nests keeps its bounds, among those that offer two or more of its members.</summary>
    private static long[] Within(FittedModel model, ImmutableArray<NestPlace> nests, WorkContext work)
    {
        var design = model.Design;
        var coefficients = model.Parameters.ToArray();
        Array.Clear(coefficients, model.Layout.Coefficients, coefficients.Length - model.Layout.Coefficients);
        var l = new double[design.Tree.Nodes.Length];
        for (var n = 0; n < l.Length; n++) l[n] = model.Layout.NodeParameter[n] is >= 0 and var k ? model.Parameters[k] : 1;
        var counts = new long[FixedChunks.Count(design.Blocks.Length)][];
        FixedChunks.Run(design.Blocks.Length, work.Threads, (chunk, first, end) =>
        {
            work.Cancellation.ThrowIfCancellationRequested();
            var tree = new TreeProbabilities(design.Tree, model.Form);
            tree.SetDissimilarities(l);
            var count = counts[chunk] = new long[nests.Length];
            LinearIndex.Walk(design, coefficients, first, end, null, (_, utility, _, offered) =>
            {
                tree.Compute(utility, offered);
                for (var i = 0; i < nests.Length; i++)
                {
                    var members = design.Tree.Nodes[nests[i].Node].Children.Count(tree.IsOffered);
                    if (members > 1 && l[nests[i].Node] <= LocalBound(tree.Probability[design.Alternatives + nests[i].Node], members)) count[i]++;
                }

                return true;
            });
        });
        return [.. Enumerable.Range(0, nests.Length).Select(i => counts.Sum(c => c[i]))];
    }
}
