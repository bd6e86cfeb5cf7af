using System.Collections.Immutable;
using PanelChoice.Covariates;
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
    /// <param name="set">Their covariates.</param>
    public static ImmutableArray<TermSpecification> TermsFor(ImmutableArray<TermSpecification> terms, CovariateSet set)
    {
        var means = new List<TermSpecification>();
        for (var i = 0; i < terms.Length; i++)
        {
            if (terms[i].Source is not ColumnSource { Moment: Now or Lag or Lead or Change } source) continue;
            if (!set.Covariates.Any(c => c.TermIndex == i && VariesWithinPersons(c, set))) continue;
            var mean = terms[i] with
            {
                Name = $"person mean of {terms[i].Name}", Source = source with { Moment = new PersonMean() }, Fixed = null, Start = null,
            };
            // A column that enters both now and lagged has one mean, and the study may have it already.
            if (!terms.Concat(means).Any(m => SameColumn(m, mean))) means.Add(mean);
        }

        return [.. means];
    }

    /// <summary>
    /// Takes out the means that are linear combinations of what stands before them, judged by the information that equal
    /// probabilities would give: a direction without variance there has none in any logit.
    /// </summary>
    /// <param name="set">Covariates of the static fit, the means last.</param>
    /// <param name="firstMean">Index of the first mean's covariate.</param>
    /// <returns>The set without them, and their names.</returns>
    public static (CovariateSet Set, ImmutableArray<string> LeftOut) WithoutCollinear(CovariateSet set, int firstMean)
    {
        var size = set.Covariates.Length;
        var information = EqualProbabilityInformation(set);
        var keep = new bool[size];
        var factor = new double[size][];
        for (var k = 0; k < size; k++)
        {
            factor[k] = new double[size];
            var variance = information[k, k];
            var left = variance;
            for (var q = 0; q < k; q++)
            {
                if (!keep[q]) continue;
                var sum = information[k, q];
                for (var r = 0; r < q; r++) if (keep[r]) sum -= factor[k][r] * factor[q][r];
                factor[k][q] = sum / factor[q][q];
                left -= factor[k][q] * factor[k][q];
            }

            keep[k] = left > SmallestPivot * variance && variance > 0;
            if (keep[k]) factor[k][k] = Math.Sqrt(left);
        }

        var stays = Enumerable.Range(0, size).Where(k => k < firstMean || keep[k]).ToList();
        return (
            set with { Covariates = [.. stays.Select(k => set.Covariates[k])] },
            [.. Enumerable.Range(firstMean, size - firstMean).Where(k => !keep[k]).Select(k => set.Covariates[k].Label)]);
    }

    internal static bool VariesWithinPersons(Covariate covariate, CovariateSet set)
    {
        if (covariate.IsConstant) return false;
        var alternatives = set.Panel.Alternatives.Length;
        var width = covariate.Enters.Length;
        for (var e = 0; e < width; e++)
        {
            var person = -1;
            var first = double.NaN;
            for (var t = 0; t < set.Used.Length; t++)
            {
                var occasion = set.Used[t];
                if (!set.Panel.Offered[(occasion * alternatives) + covariate.Enters[e]]) continue;
                var value = covariate.Values[(t * width) + e];
                if (set.Panel.PersonOf[occasion] == person && value != first) return true;
                (person, first) = (set.Panel.PersonOf[occasion], value);
            }
        }

        return false;
    }

    private static bool SameColumn(TermSpecification left, TermSpecification right) =>
        left.Source == right.Source && left.Log == right.Log && left.Times == right.Times && left.Each == right.Each && left.Base == right.Base
        && left.Alternatives.SequenceEqual(right.Alternatives);

    private static double[,] EqualProbabilityInformation(CovariateSet set)
    {
        var size = set.Covariates.Length;
        var alternatives = set.Panel.Alternatives.Length;
        var information = new double[size, size];
        var x = new double[alternatives, size];
        var mean = new double[size];
        for (var t = 0; t < set.Used.Length; t++)
        {
            Array.Clear(x);
            Array.Clear(mean);
            var offered = Enumerable.Range(0, alternatives).Where(j => set.Panel.Offered[(set.Used[t] * alternatives) + j]).ToArray();
            for (var k = 0; k < size; k++)
            {
                var covariate = set.Covariates[k];
                for (var e = 0; e < covariate.Enters.Length; e++)
                    x[covariate.Enters[e], k] = covariate.IsConstant ? 1 : covariate.Values[(t * covariate.Enters.Length) + e];
                foreach (var j in offered) mean[k] += x[j, k] / offered.Length;
            }

            foreach (var j in offered)
                for (var k = 0; k < size; k++)
                    for (var q = 0; q <= k; q++) information[k, q] += (x[j, k] - mean[k]) * (x[j, q] - mean[q]) / offered.Length;
        }

        return information;
    }
}
