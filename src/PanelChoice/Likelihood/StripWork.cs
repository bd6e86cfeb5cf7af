using System.Runtime.CompilerServices;
using System.Runtime.Intrinsics;
using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>
/// Everything one thread needs to evaluate strips: their memory, the recursion and the sums. One instance is a work space: it is not for use
/// by several threads at once.
/// </summary>
internal sealed class StripWork
{
    private const int Tile = ChoiceDesign.TileLanes;
    private readonly StripPlan plan;
    private readonly Strip strip;
    private readonly StripProbabilities probabilities;
    private readonly StripGradient gradient;
    private StripHessian? hessian;
    private ScoreRows? scoreRows;
    private Vector512<double> value;

    /// <summary>A work space for the plan's design.</summary>
    public StripWork(StripPlan plan)
    {
        this.plan = plan;
        strip = new Strip(plan);
        probabilities = new StripProbabilities(plan, strip);
        gradient = new StripGradient(plan, strip, probabilities);
    }

    private StripHessian Hessian => hessian ??= new StripHessian(plan, strip, probabilities);

    private ScoreRows ScoreRows => scoreRows ??= new ScoreRows(plan, strip, 0);

    /// <summary>Takes over parameters.</summary>
    public void Begin(ReadOnlySpan<double> parameters) => strip.Begin(parameters);

    /// <summary>Adds a block to the sums.</summary>
    public void AddBlock(DesignBlock block, in LaneWeights weights, Derivatives derivatives)
    {
        strip.KeepsAll = derivatives == Derivatives.Hessian;
        for (var lane = 0; lane < block.Lanes; lane += strip.Lanes)
        {
            if (!strip.OpenNext(block, lane, block.Lanes, weights)) continue;
            probabilities.Up();
            value += probabilities.LogLikelihood;
            if (derivatives == Derivatives.None) continue;
            probabilities.Down();
            gradient.Add();
            if (derivatives == Derivatives.Hessian) Hessian.Add();
        }
    }

    /// <summary>Hands over the sums since the last time: value, then K first and K x K second derivatives as far as they were asked for.</summary>
    public void Flush(Span<double> sums, Derivatives derivatives)
    {
        sums[0] += Vector512.Sum(value);
        value = Vector512<double>.Zero;
        if (derivatives >= Derivatives.Gradient) gradient.Flush(sums.Slice(1, plan.K));
        if (derivatives == Derivatives.Hessian) Hessian.Flush(1, sums[(1 + plan.K)..]);
    }

    /// <summary>Writes log P of a block's situations.</summary>
    public void LogProbabilities(DesignBlock block, Span<double> log)
    {
        strip.KeepsAll = true;
        for (var lane = 0; lane < block.Situations; lane += strip.Lanes)
        {
            strip.OpenNext(block, lane, block.Lanes, LaneWeights.One(0, int.MaxValue));
            probabilities.Up();
            var count = Math.Min(strip.Lanes, block.Situations - lane);
            probabilities.WriteLogProbabilities(log.Slice(block.FirstSituation + lane, count));
        }
    }

    /// <summary>Writes the derivatives of log P of a block's situations, the block's situations x K.</summary>
    public void Scores(DesignBlock block, Span<double> scores)
    {
        strip.KeepsAll = true;
        for (var lane = 0; lane < block.Situations; lane += strip.Lanes)
        {
            strip.OpenNext(block, lane, block.Lanes, LaneWeights.One(0, int.MaxValue));
            probabilities.Up();
            probabilities.Down();
            var count = Math.Min(strip.Lanes, block.Situations - lane);
            ScoreRows.Set();
            for (var k = 0; k < plan.K; k++)
                for (var i = 0; i < count; i++) scores[((lane + i) * plan.K) + k] = Unsafe.Add(ref ScoreRows.Row(k), i) / plan.Units[k];
        }
    }
}
