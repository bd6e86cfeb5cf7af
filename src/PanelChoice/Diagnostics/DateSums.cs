using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// The date score's sums over pairs of persons, and each date's means over persons. A design is walked in its own order, which is that of persons, and
/// each situation joins the sums of its date; every thread has dates of its own, and goes through the design as often as the sums of its dates do not fit
/// into the memory they may take.
/// </summary>
internal sealed class DateSums
{
    /// <summary>Memory that the open sums of dates may take.</summary>
    private const int BytesOpen = 32 << 20;

    private readonly CompactNumbers dates;
    private readonly Dictionary<long, int> place;
    private readonly int[] count;
    private readonly double[][] residual;
    private readonly double[][] cross;
    private readonly double[][] probability;

    private DateSums(CompactNumbers dates, Dictionary<long, int> place, DatePairs pairs)
    {
        this.dates = dates;
        this.place = place;
        count = new int[place.Count];
        residual = new double[place.Count][];
        cross = new double[place.Count][];
        probability = new double[place.Count][];
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
        ChoiceDesign design, NestedLogitForm form, ImmutableArray<double> parameters, double[] basis, CompactNumbers dates, int threads)
    {
        var distinct = new SortedSet<long>();
        for (var t = 0; t < design.Situations; t++) distinct.Add(dates[t]);
        var place = distinct.Select((date, d) => (date, d)).ToDictionary(x => x.date, x => x.d);
        var (J, K) = (design.Alternatives, design.Layout.Free.Length);
        var result = new DateSums(dates, place, new DatePairs(J, K));
        var parts = new DatePairs[FixedChunks.Count(place.Count)];
        foreach (var chunks in Enumerable.Range(0, parts.Length).Chunk(ChunksAtOnce(place.Count, J, K)))
        {
            // Chunks are fixed by the number of dates; how many are open at a time, and which thread has which, changes no sum.
            var shares = chunks.Chunk((chunks.Length + Math.Max(1, threads) - 1) / Math.Max(1, threads)).ToArray();
            FixedChunks.Run(shares.Length, threads, (_, first, end) =>
            {
                for (var s = first; s < end; s++) result.SumChunks(design, form, parameters, basis, shares[s], parts);
            });
        }

        foreach (var part in parts) result.Pairs.Join(part);
        return result;
    }

    /// <summary>Takes the date's mean over persons off a residual, its E and its prediction.</summary>
    public void Demean(int situation, Span<double> g, Span<double> e, Span<double> p)
    {
        var d = place[dates[situation]];
        Subtract(g, residual[d], count[d]);
        Subtract(e, cross[d], count[d]);
        Subtract(p, probability[d], count[d]);
    }

    private static int ChunksAtOnce(int dates, int J, int K)
    {
        var bytes = DatePairs.DoublesOfDate(J, K) * sizeof(double) * (long)((dates + FixedChunks.Count(dates) - 1) / FixedChunks.Count(dates));
        return (int)Math.Clamp(BytesOpen / bytes, 1, FixedChunks.Count(dates));
    }

    /// <summary>Sums the dates of some neighbouring chunks on one walk through the design.</summary>
    private void SumChunks(ChoiceDesign design, NestedLogitForm form, ImmutableArray<double> parameters, double[] basis, int[] chunks, DatePairs[] parts)
    {
        var first = FixedChunks.Start(count.Length, chunks[0]);
        var end = FixedChunks.Start(count.Length, chunks[^1] + 1);
        var scores = new SituationScores(design, form, parameters.AsSpan(), basis);
        var open = new DatePairs.OneDate[end - first];
        for (var d = 0; d < open.Length; d++) open[d] = new DatePairs.OneDate(scores.J, scores.K);
        for (var t = 0; t < design.Situations; t++)
        {
            var d = place[dates[t]];
            if (d < first || d >= end) continue;
            scores.Load(t);
            open[d - first].Add(scores);
        }

        foreach (var chunk in chunks)
        {
            var pairs = new DatePairs(scores.J, scores.K);
            for (var d = FixedChunks.Start(count.Length, chunk); d < FixedChunks.Start(count.Length, chunk + 1); d++)
            {
                var date = open[d - first];
                pairs.Add(date);
                count[d] = date.Persons;
                residual[d] = date.G;
                cross[d] = date.B;
                probability[d] = date.P;
            }

            parts[chunk] = pairs;
        }
    }

    private static void Subtract(Span<double> from, double[] sum, int count)
    {
        for (var k = 0; k < sum.Length; k++) from[k] -= sum[k] / count;
    }
}
