using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>
/// Replicates from blocks of consecutive occasions. Moving: each person's record is made of blocks of it, as many occasions as before (Kunsch 1989); for few
/// persons with long records. Calendar: blocks of consecutive days, the same for all persons (Goncalves 2011); for shocks that everybody meets on the same
/// day. A row carries the lags it was built with, so that no joint between blocks invents a false yesterday. Weights are counts of draws; their
/// refits go through the same refitter, on a view of the design in which every situation, or every day, is a cluster.
/// </summary>
internal static class BlockBootstrap
{
    /// <summary>What the study's blocks are drawn from; null where it draws whole clusters.</summary>
    /// <param name="model">The fitted model.</param>
    /// <param name="settings">Blocks, their length, the seed.</param>
    /// <param name="days">Day of each situation where days are the same for everybody; null where they are not.</param>
    /// <param name="threads">Threads of the refitter; no figure depends on it.</param>
    public static BlockDraws? Of(FittedModel model, InferenceSettings settings, CompactNumbers? days, int threads)
    {
        if (settings.Blocks == BootstrapBlocks.Cluster || settings.Replicates == 0) return null;
        if (model.Status != FitStatus.Converged || model.Layout.Free.IsEmpty) return BlockDraws.Refused("There is no maximum to draw blocks around.");
        return settings.Blocks == BootstrapBlocks.Moving ? Moving(model, settings, threads) : Calendar(model, settings, days, threads);
    }

    private static BlockDraws Moving(FittedModel model, InferenceSettings settings, int threads)
    {
        var start = model.Design.PersonStart;
        var length = settings.BlockLength ?? BlockLength.Of(Influence(model), start);
        if (Enumerable.Range(0, start.Length - 1).All(p => start[p + 1] - start[p] <= length))
            return BlockDraws.Refused($"No person has more than the {length} occasions of a block, so that every replicate would be the sample itself.");
        var blocks = Enumerable.Range(0, start.Length - 1).Sum(p => Count(start[p + 1] - start[p], length));
        var view = model.Design.BySituation("occasion", null, model.Design.Situations);
        return new BlockDraws(
            length, settings.BlockLength is null, blocks, RefitterOf(model, view, threads), r => MovingWeights(settings.BootstrapSeed, r, start, length), null);
    }

    private static BlockDraws Calendar(FittedModel model, InferenceSettings settings, CompactNumbers? days, int threads)
    {
        if (days is null) return BlockDraws.Refused("Blocks of days need occasions that are the same day for everybody: shared_calendar = true under [panel].");
        var situations = model.Design.Situations;
        var order = new SortedDictionary<long, int>();
        for (var s = 0; s < situations; s++) order[days[s]] = 0;
        var next = 0;
        foreach (var day in order.Keys.ToList()) order[day] = next++;
        var dayOf = new int[situations];
        for (var s = 0; s < situations; s++) dayOf[s] = order[days[s]];
        var length = settings.BlockLength ?? BlockLength.Of(ByDay(Influence(model), dayOf, next), [0, next]);
        if (next <= length) return BlockDraws.Refused($"There are no more than the {length} days of a block, so that every replicate would be the sample itself.");
        return new BlockDraws(
            length, settings.BlockLength is null, Count(next, length), RefitterOf(model, model.Design.BySituation("day", dayOf, next), threads),
            r => CalendarWeights(settings.BootstrapSeed, r, next, length), null);
    }

    /// <summary>How often each situation is drawn: blocks at starts that are equally likely, the last one cut so that every record keeps its length.</summary>
    public static ImmutableArray<double> MovingWeights(long seed, int replicate, IReadOnlyList<int> personStart, int length)
    {
        var random = new CounterRandom(seed, "bootstrap moving", replicate);
        var weights = new double[personStart[^1]];
        for (var p = 0; p + 1 < personStart.Count; p++)
            Draw(random, weights.AsSpan(personStart[p], personStart[p + 1] - personStart[p]), length);
        return ImmutableCollectionsMarshal.AsImmutableArray(weights);
    }

    /// <summary>How often each day is drawn.</summary>
    public static ImmutableArray<double> CalendarWeights(long seed, int replicate, int days, int length)
    {
        var weights = new double[days];
        Draw(new CounterRandom(seed, "bootstrap calendar", replicate), weights, length);
        return ImmutableCollectionsMarshal.AsImmutableArray(weights);
    }

    private static void Draw(CounterRandom random, Span<double> record, int length)
    {
        var block = Math.Min(length, record.Length);
        for (var left = record.Length; left > 0; left -= block)
        {
            var first = random.Next(record.Length - block + 1);
            foreach (ref var count in record.Slice(first, Math.Min(block, left))) count++;
        }
    }

    private static int Count(int occasions, int length) => (occasions + length - 1) / length;

    private static ClusterRefitter RefitterOf(FittedModel model, ChoiceDesign view, int threads) =>
        new(model with { Likelihood = LikelihoodKernel.Create(view, model.Form, threads), Survey = null }, threads);

    /// <summary>Each situation's influence e'H^-1 s on the term whose dependence matters most: the first on past choices, else the first.</summary>
    private static double[] Influence(FittedModel model)
    {
        var design = model.Design;
        var layout = model.Layout;
        var k = layout.Count;
        var free = layout.Free;
        var term = free.FirstOrDefault(p => layout.Parameters[p].Role == CovariateRole.PastChoice, free[0]);
        var factor = ScaledCholesky.Factor([.. free.SelectMany(r => free.Select(c => -model.Hessian[(r * k) + c]))], free.Length, out _);
        var influence = new double[design.Situations];
        if (factor is null) return influence;
        var row = new double[free.Length];
        row[free.IndexOf(term)] = 1;
        factor.Solve(row);
        var scores = Array.Empty<double>();
        foreach (var block in design.Blocks)
        {
            if (scores.Length < block.Situations * k) scores = new double[block.Situations * k];
            model.Likelihood.Scores(model.Parameters.AsSpan(), block, scores);
            for (var s = 0; s < block.Situations; s++)
            {
                var sum = 0.0;
                for (var i = 0; i < free.Length; i++) sum += row[i] * scores[(s * k) + free[i]];
                influence[block.FirstSituation + s] = sum;
            }
        }

        for (var p = 0; p < design.Persons; p++)
            for (var s = design.PersonStart[p]; s < design.PersonStart[p + 1]; s++) influence[s] *= design.PersonWeight[p];
        return influence;
    }

    private static double[] ByDay(double[] influence, int[] dayOf, int days)
    {
        var sums = new double[days];
        for (var s = 0; s < influence.Length; s++) sums[dayOf[s]] += influence[s];
        return sums;
    }
}
