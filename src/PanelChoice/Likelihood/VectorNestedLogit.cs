using System.Collections.Concurrent;
using System.Numerics.Tensors;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Likelihood;

/// <summary>
/// The kernel that <c>estimate</c> runs: eight situations at a time, one in each lane of a vector. The blocks of a design are cut into strips
/// that stay in the cache (<see cref="Strip"/>); a strip goes up and down the tree (<see cref="StripProbabilities"/>), and its
/// derivatives are summed (<see cref="StripGradient"/>, <see cref="StripHessian"/>). Formulas: <see cref="TreeProbabilities"/> and
/// <see cref="ScalarNestedLogit"/>, against which it is checked.
/// <para>
/// Chunks of blocks are fixed and their sums are added in chunk order, so the bits depend on the design and the width of the machine's vectors
/// alone; the width is in the kernel's name. Where the machine has no 512-bit vectors, a tile of eight lanes is worked in halves or quarters.
/// </para>
/// </summary>
internal sealed class VectorNestedLogit : IChoiceLikelihood, IReplicateLikelihood
{
    /// <summary>Below this many situations handing work to another thread costs more than it brings.</summary>
    internal const int SituationsForThreads = 50_000;

    /// <summary>Persons whose derivatives are held at a time.</summary>
    private const int PersonsAtOnce = 2048;

    private readonly StripPlan plan;
    private readonly int threads;

    /// <summary>Blocks that always share a chunk: where no second thread waits for one, a chunk for each block costs more in adding up than it brings.</summary>
    private readonly int blocksInARun;
    private readonly ConcurrentBag<StripWork> idle = [];
    private readonly ConcurrentBag<ReplicateWork> idleReplicates = [];
    private readonly ConcurrentBag<ScoreWork> idleScores = [];

    /// <summary>The kernel on a design.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">The form.</param>
    /// <param name="threads">Threads, 1 or more; the result does not depend on it.</param>
    public VectorNestedLogit(ChoiceDesign design, NestedLogitForm form, int threads)
    {
        Design = design;
        plan = new StripPlan(design, form);
        var isSmall = design.Situations < SituationsForThreads;
        this.threads = isSmall ? 1 : threads;
        blocksInARun = isSmall ? 8 : 1;
    }

    public ChoiceDesign Design { get; }

    /// <summary>The kernel's name in this process: it says how wide the machine's vectors are.</summary>
    public static string Name { get; } =
        Vector512.IsHardwareAccelerated ? "vector512" : Vector256.IsHardwareAccelerated ? "vector256" : "vector128";

    public string Kernel => Name;

    private int K => plan.K;

    public LikelihoodEvaluation Evaluate(ReadOnlySpan<double> parameters, ReadOnlySpan<double> personWeight, Derivatives derivatives)
    {
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.Undefined(K, derivatives);
        var weight = personWeight.ToArray();
        var gradient = derivatives >= Derivatives.Gradient ? K : 0;
        var hessian = derivatives == Derivatives.Hessian ? K * K : 0;
        var length = 1 + gradient + hessian;
        var runs = (Design.Blocks.Length + blocksInARun - 1) / blocksInARun;
        var parts = new double[FixedChunks.Count(runs) * length];
        Run(runs, parameters, (work, chunk, first, end) =>
        {
            var last = Math.Min(end * blocksInARun, Design.Blocks.Length);
            for (var b = first * blocksInARun; b < last; b++) work.AddBlock(Design.Blocks[b], LaneWeights.OfPersons(weight), derivatives);
            work.Flush(parts.AsSpan(chunk * length, length), derivatives);
        });

        var total = FixedChunks.Sum(parts, length);
        return new LikelihoodEvaluation(
            total[0],
            ImmutableCollectionsMarshal.AsImmutableArray(total[1..(1 + gradient)]),
            ImmutableCollectionsMarshal.AsImmutableArray(total[(1 + gradient)..]));
    }

    public double[] Scores(ReadOnlySpan<double> parameters)
    {
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.Nan(Design.Situations * K);
        var scores = new double[Design.Situations * K];
        Run(Design.Blocks.Length, parameters, (work, _, first, end) =>
        {
            for (var b = first; b < end; b++) work.Scores(Design.Blocks[b], scores.AsSpan(Design.Blocks[b].FirstSituation * K));
        });
        return scores;
    }

    public void Scores(ReadOnlySpan<double> parameters, DesignBlock block, Span<double> scores)
    {
        if (!ParameterDomain.Contains(Design.Layout, parameters))
        {
            scores[..(block.Situations * K)].Fill(double.NaN);
            return;
        }

        if (!idle.TryTake(out var work)) work = new StripWork(plan);
        work.Begin(parameters);
        work.Scores(block, scores);
        idle.Add(work);
    }

    public SampleScores SumScores(ReadOnlySpan<double> parameters, ReadOnlySpan<double> personWeight)
    {
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.NoScores(Design);
        var theta = parameters.ToArray();
        var weight = personWeight.ToArray();
        var byPerson = new double[Design.Persons * K];
        var parts = new double[FixedChunks.Count(Design.Blocks.Length) * K * K];
        FixedChunks.Run(Design.Blocks.Length, threads, (chunk, first, end) =>
        {
            if (!idleScores.TryTake(out var work)) work = new ScoreWork(plan);
            work.Begin(theta);
            for (var b = first; b < end; b++) work.AddBlock(Design.Blocks[b], weight, byPerson);
            work.Flush(parts.AsSpan(chunk * K * K, K * K));
            idleScores.Add(work);
        });

        return new SampleScores(byPerson, FixedChunks.Sum(parts, K * K));
    }

    public double[] LogProbabilities(ReadOnlySpan<double> parameters)
    {
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.Nan(Design.Situations);
        var log = new double[Design.Situations];
        Run(Design.Blocks.Length, parameters, (work, _, first, end) =>
        {
            for (var b = first; b < end; b++) work.LogProbabilities(Design.Blocks[b], log);
        });
        return log;
    }

    public double[] PersonInformation(ReadOnlySpan<double> parameters) => PersonInformation(parameters, 0, Design.Persons);

    public double[] PersonInformation(ReadOnlySpan<double> parameters, int firstPerson, int endPerson)
    {
        var persons = endPerson - firstPerson;
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.Nan(persons * K * K);
        var information = new double[persons * K * K];
        var theta = parameters.ToArray();
        FixedChunks.Run(persons, threads, (_, first, end) =>
        {
            if (!idleReplicates.TryTake(out var work)) work = new ReplicateWork(plan);
            work.Begin(theta);
            for (var p = first; p < end; p++)
            {
                var own = information.AsSpan(p * K * K, K * K);
                work.PersonHessian(firstPerson + p, own);
                TensorPrimitives.Negate(own, own);
            }

            idleReplicates.Add(work);
        });
        return information;
    }

    /// <summary>Blocks outside, points inside: the columns of a block are still in the cache for the points after the first.</summary>
    public LikelihoodEvaluation[] Gradients(IReadOnlyList<WeightedPoint> points, CancellationToken cancellation)
    {
        ArgumentNullException.ThrowIfNull(points);
        var length = 1 + K;
        var chunks = FixedChunks.Count(Design.Blocks.Length);
        var inside = points.Select(p => ParameterDomain.Contains(Design.Layout, p.Parameters)).ToArray();
        var parts = new double[chunks * points.Count * length];
        FixedChunks.Run(Design.Blocks.Length, threads, (chunk, first, end) =>
        {
            if (cancellation.IsCancellationRequested) return;
            if (!idleReplicates.TryTake(out var work)) work = new ReplicateWork(plan);
            for (var b = first; b < end; b++)
                for (var i = 0; i < points.Count; i++)
                {
                    if (!inside[i]) continue;
                    work.Begin(points[i].Parameters);
                    work.AddBlock(Design.Blocks[b], points[i].PersonWeight, parts.AsSpan(((chunk * points.Count) + i) * length, length));
                }

            idleReplicates.Add(work);
        });
        cancellation.ThrowIfCancellationRequested();
        return [.. points.Select((_, i) => inside[i] ? Sum(i) : ParameterDomain.Undefined(K, Derivatives.Gradient))];

        LikelihoodEvaluation Sum(int i)
        {
            var total = new double[length];
            for (var chunk = 0; chunk < chunks; chunk++)
                for (var k = 0; k < length; k++) total[k] += parts[(((chunk * points.Count) + i) * length) + k];
            return new LikelihoodEvaluation(total[0], ImmutableCollectionsMarshal.AsImmutableArray(total[1..]), []);
        }
    }

    public void ForEachPerson(double[] parameters, PersonDerivatives take, CancellationToken cancellation)
    {
        ArgumentNullException.ThrowIfNull(take);
        var length = K + (K * K);
        var window = new double[Math.Min(Design.Persons, PersonsAtOnce) * length];
        var isInside = ParameterDomain.Contains(Design.Layout, parameters);
        if (!isInside) Array.Fill(window, double.NaN);
        for (var from = 0; from < Design.Persons; from += PersonsAtOnce)
        {
            cancellation.ThrowIfCancellationRequested();
            var count = Math.Min(PersonsAtOnce, Design.Persons - from);
            if (isInside) FixedChunks.Run(count, threads, (_, first, end) =>
            {
                if (!idleReplicates.TryTake(out var work)) work = new ReplicateWork(plan);
                work.Begin(parameters);
                for (var p = first; p < end; p++) work.PersonDerivatives(from + p, window.AsSpan(p * length, length));
                idleReplicates.Add(work);
            });
            for (var p = 0; p < count; p++) take(from + p, window.AsSpan(p * length, K), window.AsSpan((p * length) + K, K * K));
        }
    }

    /// <summary>Runs the action for every chunk of items with a work space that holds the parameters.</summary>
    private void Run(int items, ReadOnlySpan<double> parameters, Action<StripWork, int, int, int> action)
    {
        var theta = parameters.ToArray();
        FixedChunks.Run(items, threads, (chunk, first, end) =>
        {
            if (!idle.TryTake(out var work)) work = new StripWork(plan);
            work.Begin(theta);
            action(work, chunk, first, end);
            idle.Add(work);
        });
    }
}
