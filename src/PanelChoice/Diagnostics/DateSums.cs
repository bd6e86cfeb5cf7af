using System.Runtime.InteropServices;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;

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

    private DateSums(CompactNumbers dates, Dictionary<long, int> place, int[] count, DatePairs pairs)
    {
        this.dates = dates;
        this.place = place;
        this.count = count;
        residual = new double[place.Count][];
        cross = new double[place.Count][];
        probability = new double[place.Count][];
        Pairs = pairs;
    }

    /// <summary>Sums over pairs of persons of all dates.</summary>
    public DatePairs Pairs { get; }

    /// <summary>Sums a design by date.</summary>
    /// <param name="kernel">The design's residuals.</param>
    /// <param name="basis">The whitening basis at the same parameters.</param>
    /// <param name="dates">Date of each situation: any numbers that are equal for the same day.</param>
    /// <param name="threads">Threads; no figure depends on it.</param>
    public static DateSums Sum(ResidualKernel kernel, double[] basis, CompactNumbers dates, int threads)
    {
        var persons = new Dictionary<long, int>();
        for (var t = 0; t < kernel.Layout.Design.Situations; t++) CollectionsMarshal.GetValueRefOrAddDefault(persons, dates[t], out _)++;
        var place = persons.Keys.Order().Select((date, d) => (date, d)).ToDictionary(x => x.date, x => x.d);
        var (J, K) = (kernel.Layout.J, kernel.Layout.K);
        var result = new DateSums(dates, place, [.. persons.OrderBy(p => p.Key).Select(p => p.Value)], new DatePairs(J, K));
        var parts = new DatePairs[FixedChunks.Count(place.Count)];
        foreach (var chunks in Enumerable.Range(0, parts.Length).Chunk(ChunksAtOnce(place.Count, J, K)))
        {
            // Chunks are fixed by the number of dates; how many are open at a time, and which thread has which, changes no sum.
            var shares = chunks.Chunk((chunks.Length + Math.Max(1, threads) - 1) / Math.Max(1, threads)).ToArray();
            FixedChunks.Run(shares.Length, threads, (_, first, end) =>
            {
                for (var s = first; s < end; s++) kernel.Lend(residuals => result.SumChunks(new SituationScores(residuals, basis), kernel.Layout.Design, shares[s], parts));
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
    private void SumChunks(SituationScores scores, ChoiceDesign design, int[] chunks, DatePairs[] parts)
    {
        var first = FixedChunks.Start(count.Length, chunks[0]);
        var end = FixedChunks.Start(count.Length, chunks[^1] + 1);
        var open = new DatePairs.OneDate[end - first];
        var partOf = new DatePairs[end - first];
        foreach (var chunk in chunks)
        {
            parts[chunk] = new DatePairs(scores.J, scores.K);
            for (var d = FixedChunks.Start(count.Length, chunk); d < FixedChunks.Start(count.Length, chunk + 1); d++)
                (open[d - first], partOf[d - first]) = (new DatePairs.OneDate(scores.J, scores.K), parts[chunk]);
        }

        var person = new PersonOnDate(scores.J, scores.K);
        foreach (var block in design.Blocks)
            scores.ForEach(
                block,
                t =>
                {
                    var d = place[dates[t]];
                    person.Set(scores);
                    open[d - first].Add(person);
                    if (count[d] > 1) partOf[d - first].AddPerson(person);
                },
                t => place[dates[t]] is var d && d >= first && d < end);

        for (var d = first; d < end; d++)
        {
            var date = open[d - first];
            if (count[d] > 1) partOf[d - first].Add(date);
            residual[d] = date.G;
            cross[d] = date.B;
            probability[d] = date.P;
        }
    }

    private static void Subtract(Span<double> from, double[] sum, int count)
    {
        for (var k = 0; k < Math.Min(from.Length, sum.Length); k++) from[k] -= sum[k] / count;
    }
}
