using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>Walks a design date by date: the date score's sums over pairs of persons, and each date's means over persons.</summary>
internal sealed class DateSums
{
    private readonly int[] dateOf;
    private readonly int[] count;
    private readonly double[][] residual;
    private readonly double[][] cross;
    private readonly double[][] probability;

    private DateSums(int[] dateOf, int dates, DatePairs pairs)
    {
        this.dateOf = dateOf;
        count = new int[dates];
        residual = new double[dates][];
        cross = new double[dates][];
        probability = new double[dates][];
        Pairs = pairs;
    }

    /// <summary>Sums over pairs of persons of all dates.</summary>
    public DatePairs Pairs { get; }

    /// <summary>Sums a design by date.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">The form.</param>
    /// <param name="parameters">All parameters.</param>
    /// <param name="basis">The whitening basis at these parameters.</param>
    /// <param name="dates">Date of each situation: any numbers that are equal for the same day.</param>
    /// <param name="threads">Threads; no figure depends on it.</param>
    public static DateSums Sum(
        ChoiceDesign design, NestedLogitForm form, ImmutableArray<double> parameters, double[] basis, ImmutableArray<long> dates, int threads)
    {
        var byDate = Enumerable.Range(0, design.Situations).GroupBy(t => dates[t]).OrderBy(d => d.Key).Select(d => d.ToArray()).ToArray();
        var dateOf = new int[design.Situations];
        for (var d = 0; d < byDate.Length; d++)
            foreach (var t in byDate[d]) dateOf[t] = d;
        var result = new DateSums(dateOf, byDate.Length, new DatePairs(design.Alternatives, design.Layout.Free.Length));
        var parts = new DatePairs[FixedChunks.Count(byDate.Length)];
        FixedChunks.Run(byDate.Length, threads, (chunk, first, end) =>
        {
            var scores = new SituationScores(design, form, parameters.AsSpan(), basis);
            var pairs = new DatePairs(scores.J, scores.K);
            for (var d = first; d < end; d++)
            {
                pairs.Begin();
                foreach (var t in byDate[d])
                {
                    scores.Load(t);
                    pairs.Add(scores);
                }

                pairs.End();
                result.count[d] = byDate[d].Length;
                result.residual[d] = pairs.Residual.ToArray();
                result.cross[d] = pairs.Cross.ToArray();
                result.probability[d] = pairs.Probability.ToArray();
            }

            parts[chunk] = pairs;
        });

        foreach (var part in parts) result.Pairs.Join(part);
        return result;
    }

    /// <summary>Takes the date's mean over persons off a residual, its E and its prediction.</summary>
    public void Demean(int situation, Span<double> g, Span<double> e, Span<double> p)
    {
        var d = dateOf[situation];
        Subtract(g, residual[d], count[d]);
        Subtract(e, cross[d], count[d]);
        Subtract(p, probability[d], count[d]);
    }

    private static void Subtract(Span<double> from, double[] sum, int count)
    {
        for (var k = 0; k < sum.Length; k++) from[k] -= sum[k] / count;
    }
}
