using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// What one thread needs to evaluate the strips of a block for one replicate after the other, and for one person after the other. Unlike
/// <see cref="StripWork"/> it leaves out, inside a block, the tiles of persons that a replicate does not have (of clusters drawn with replacement
/// 37 percent are not drawn). One instance is a work space: it is not for use by several threads at once.
/// </summary>
internal sealed class ReplicateWork
{
    private const int Tile = ChoiceDesign.TileLanes;

    /// <summary>Tiles without weight that are worth leaving out: a strip more costs about as much as this many tiles.</summary>
    private const int ShortestGap = 3;

    private readonly StripPlan plan;
    private readonly Strip strip;
    private readonly StripProbabilities probabilities;
    private readonly StripGradient gradient;
    private StripHessian? hessian;
    private Vector512<double> value;

    /// <summary>A work space for the plan's design.</summary>
    public ReplicateWork(StripPlan plan)
    {
        this.plan = plan;
        strip = new Strip(plan);
        probabilities = new StripProbabilities(plan, strip);
        gradient = new StripGradient(plan, strip, probabilities);
    }

    /// <summary>Takes over parameters.</summary>
    public void Begin(ReadOnlySpan<double> parameters) => strip.Begin(parameters);

    /// <summary>Adds value and gradient of a block.</summary>
    /// <param name="block">The block.</param>
    /// <param name="personWeight">One weight for each of the design's persons.</param>
    /// <param name="sums">Receives the sums: the value, then K first derivatives.</param>
    public void AddBlock(DesignBlock block, ReadOnlySpan<double> personWeight, Span<double> sums)
    {
        var start = plan.Design.PersonStart;
        var end = block.FirstSituation + block.Situations;
        var weights = LaneWeights.OfPersons(personWeight);
        strip.KeepsAll = false;
        int from = 0, to = -1;
        for (var p = plan.Design.PersonOf[block.FirstSituation]; p < personWeight.Length && start[p] < end; p++)
        {
            if (personWeight[p] == 0) continue;
            var first = (start[p] - block.FirstSituation) / Tile;
            if (to < 0) from = first;
            else if (first - to > ShortestGap)
            {
                AddTiles(block, from, to, weights);
                from = first;
            }

            to = (start[p + 1] - block.FirstSituation + Tile - 1) / Tile;
        }

        if (to < 0) return;
        AddTiles(block, from, to, weights);
        sums[0] += Vector512.Sum(value);
        value = Vector512<double>.Zero;
        gradient.Flush(sums[1..]);
    }

    /// <summary>Writes the derivatives of one person's log-likelihood: K first, then K x K second.</summary>
    public void PersonDerivatives(int person, Span<double> derivatives)
    {
        derivatives.Clear();
        AddPerson(person, withGradient: true);
        gradient.Flush(derivatives[..plan.K]);
        hessian!.Flush(1, derivatives[plan.K..]);
    }

    /// <summary>Writes the K x K second derivatives of one person's log-likelihood.</summary>
    public void PersonHessian(int person, Span<double> second)
    {
        second.Clear();
        AddPerson(person, withGradient: false);
        hessian!.Flush(1, second);
    }

    private void AddPerson(int person, bool withGradient)
    {
        var design = plan.Design;
        var (first, end) = (design.PersonStart[person], design.PersonStart[person + 1]);
        var block = design.Blocks[design.BlockOf[first]];
        hessian ??= new StripHessian(plan, strip, probabilities);
        strip.KeepsAll = true;
        var tiles = (end - block.FirstSituation + Tile - 1) / Tile;
        var weights = LaneWeights.One(first, end);
        for (var lane = (first - block.FirstSituation) / Tile * Tile; lane < tiles * Tile; lane += strip.Lanes)
        {
            strip.OpenNext(block, lane, tiles * Tile, weights);
            probabilities.Up();
            probabilities.Down();
            if (withGradient) gradient.Add();
            hessian.Add();
        }
    }

    private void AddTiles(DesignBlock block, int from, int to, in LaneWeights weights)
    {
        for (var lane = from * Tile; lane < to * Tile; lane += strip.Lanes)
        {
            if (!strip.OpenNext(block, lane, to * Tile, weights)) continue;
            probabilities.Up();
            value += probabilities.LogLikelihood;
            probabilities.Down();
            gradient.Add();
        }
    }
}
