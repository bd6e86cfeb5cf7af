using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// Person means beside the attributes of the static fit (Mundlak 1978). Without them a lasting taste that goes with a person's usual
/// conditions passes for an effect of the last occasion's conditions, and the cause rule takes it for habit.
/// </summary>
internal static class PersonMeans
{
    /// <summary>Share of a column's variance that must be left after the columns before it.</summary>
    private const double SmallestPivot = 1e-8;

    /// <summary>One mean term for each column that varies within persons.</summary>
    /// <param name="terms">Terms of the static fit.</param>
    /// <param name="varies">Whether a covariate of the term varies within persons.</param>
    public static ImmutableArray<TermSpecification> TermsFor(ImmutableArray<TermSpecification> terms, Func<TermSpecification, bool> varies)
    {
        var means = new List<TermSpecification>();
        foreach (var term in terms)
        {
            if (term.Source is not ColumnSource { Moment: Now or Lag or Lead or Change } source || !varies(term)) continue;
            var mean = term with
            {
                Name = $"person mean of {term.Name}", Source = source with { Moment = new PersonMean() }, Fixed = null, Start = null,
            };
            // A column that enters both now and lagged has one mean, and the study may have it already.
            if (!terms.Concat(means).Any(m => SameColumn(m, mean))) means.Add(mean);
        }

        return [.. means];
    }

    /// <summary>
    /// The means that are linear combinations of what stands before them, judged by the information that equal
    /// probabilities would give: a direction without variance there has none in any logit.
    /// </summary>
    /// <param name="design">Design of the static fit, the means last among its coefficients.</param>
    /// <param name="firstMean">The first mean's coefficient.</param>
    /// <param name="threads">Threads; the result does not depend on it.</param>
    public static ImmutableSortedSet<int> Collinear(ChoiceDesign design, int firstMean, int threads)
    {
        var size = design.Layout.Coefficients;
        var information = EqualProbabilityInformation(design, threads);
        var keep = new bool[size];
        var factor = new double[size][];
        for (var k = 0; k < size; k++)
        {
            factor[k] = new double[size];
            var variance = information[(k * size) + k];
            var left = variance;
            for (var q = 0; q < k; q++)
            {
                if (!keep[q]) continue;
                var sum = information[(k * size) + q];
                for (var r = 0; r < q; r++) if (keep[r]) sum -= factor[k][r] * factor[q][r];
                factor[k][q] = sum / factor[q][q];
                left -= factor[k][q] * factor[k][q];
            }

            keep[k] = left > SmallestPivot * variance && variance > 0;
            if (keep[k]) factor[k][k] = Math.Sqrt(left);
        }

        return [.. Enumerable.Range(firstMean, size - firstMean).Where(k => !keep[k])];
    }

    /// <summary>Whether each coefficient's covariate varies within some person, over the situations in which an alternative that it enters is offered.</summary>
    internal static bool[] VaryWithinPersons(ChoiceDesign design)
    {
        var columns = design.Columns.Where(c => c.Storage >= 0).ToArray();
        var varies = new bool[design.Layout.Coefficients];
        var value = new double[columns.Length];
        var lastPerson = new int[columns.Length];
        Array.Fill(lastPerson, -1);
        var reader = design.Store.Reader();
        foreach (var block in design.Blocks)
        {
            reader.Open(block);
            for (int lane = 0, person = design.PersonOf[block.FirstSituation]; lane < block.Situations; lane++)
            {
                if (block.FirstSituation + lane == design.PersonStart[person + 1]) person++;
                for (var c = 0; c < columns.Length; c++)
                {
                    if (varies[columns[c].Parameter] || !reader.IsOffered(lane, columns[c].Alternative)) continue;
                    var here = reader.Value(columns[c].Storage, lane);
                    if (lastPerson[c] == person && here != value[c]) varies[columns[c].Parameter] = true;
                    (lastPerson[c], value[c]) = (person, here);
                }
            }
        }

        return varies;
    }

    private static bool SameColumn(TermSpecification left, TermSpecification right) =>
        left.Source == right.Source && left.Log == right.Log && left.Times == right.Times && left.Each == right.Each && left.Base == right.Base
        && left.Alternatives.SequenceEqual(right.Alternatives);

    /// <summary>
    /// Sum over situations of the cross-products of deviations from the mean over offered alternatives, divided by the number of these. From deviations,
    /// not from a likelihood's second derivatives: those lose the digits that a column's mean has more than its deviations.
    /// </summary>
    private static double[] EqualProbabilityInformation(ChoiceDesign design, int threads)
    {
        var (size, alternatives) = (design.Layout.Coefficients, design.Alternatives);
        var width = PaddedRows.Padded(size);
        var parts = new double[FixedChunks.Count(design.Blocks.Length) * width * width];
        FixedChunks.Run(design.Blocks.Length, threads, (chunk, first, end) =>
        {
            var deviation = new double[alternatives * width];
            var share = new double[alternatives * width];
            var mean = new double[width];
            var reader = design.Store.Reader();
            for (var b = first; b < end; b++)
            {
                var block = design.Blocks[b];
                reader.Open(block);
                for (var lane = 0; lane < block.Situations; lane++)
                {
                    var offered = 0;
                    Array.Clear(deviation);
                    Array.Clear(share);
                    Array.Clear(mean);
                    foreach (var c in design.Columns)
                        if (reader.IsOffered(lane, c.Alternative)) deviation[(c.Alternative * width) + c.Parameter] = reader.Value(c.Storage, lane);
                    for (var j = 0; j < alternatives; j++)
                    {
                        if (!reader.IsOffered(lane, j)) continue;
                        offered++;
                        PaddedRows.Add(1, deviation.AsSpan(j * width, width), mean);
                    }

                    for (var j = 0; j < alternatives; j++)
                        if (reader.IsOffered(lane, j)) PaddedRows.Add(-1.0 / offered, mean, deviation.AsSpan(j * width, width));
                    PaddedRows.Add(1.0 / offered, deviation, share);
                    PaddedRows.Product(
                        deviation, 1, width, share, alternatives, width, width, parts.AsSpan(chunk * width * width, width * width), isAdded: true, isSymmetric: true);
                }
            }
        });
        return PaddedRows.Symmetric(FixedChunks.Sum(parts, width * width), size);
    }
}
