using MathNet.Numerics.Distributions;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>
/// The columns of a synthetic commute panel, drawn person by person: two attributes of every alternative, waits of two, terms of single
/// alternatives, lasting tastes, alternatives that are not there, and choices made from them one after the other.
/// </summary>
internal sealed class CommuteDraws
{
    /// <summary>Share of the habit stock kept from one occasion to the next.</summary>
    public const double Retention = 0.8;

    private readonly CommuteShape shape;
    private readonly CommuteMarket market;
    private readonly double[] truth;
    private readonly bool isRounded;

    private CommuteDraws(CommuteShape shape, CommuteMarket market, double[] truth, bool isRounded)
    {
        this.shape = shape;
        this.market = market;
        this.truth = truth;
        this.isRounded = isRounded;
        var cells = shape.Situations * shape.Alternatives;
        (Time, Cost, Last, Offered) = (new double[cells], new double[cells], new double[cells], new bool[cells]);
        Stock = shape.HasStock ? new double[cells] : [];
        Wait = new double[shape.Situations * market.Waiting.Length];
        Single = [.. Enumerable.Range(0, shape.Singles).Select(_ => new double[shape.Situations])];
        Chosen = new int[shape.Situations];
    }

    /// <summary>Time by occasion and alternative, between 1 and 2; 0 where not offered, as in all columns here.</summary>
    public double[] Time { get; }

    /// <summary>Cost by occasion and alternative, between 0 and 2.</summary>
    public double[] Cost { get; }

    /// <summary>1 for the alternative chosen on the occasion before.</summary>
    public double[] Last { get; }

    /// <summary>The habit stock; empty where the shape has none.</summary>
    public double[] Stock { get; }

    /// <summary>Wait by occasion and waiting alternative, between 0 and 1.</summary>
    public double[] Wait { get; }

    /// <summary>Each term of a single alternative by occasion, between 0 and 1.</summary>
    public double[][] Single { get; }

    /// <summary>Which alternatives are offered.</summary>
    public bool[] Offered { get; }

    /// <summary>The alternative chosen on each occasion.</summary>
    public int[] Chosen { get; }

    /// <summary>Draws a panel.</summary>
    /// <param name="shape">Its size and terms.</param>
    /// <param name="market">Its alternatives.</param>
    /// <param name="truth">The parameters that choices are made with.</param>
    /// <param name="isRounded">Whether attributes come with two or three decimals, as recorded ones do; else with all digits.</param>
    public static CommuteDraws Of(CommuteShape shape, CommuteMarket market, double[] truth, bool isRounded)
    {
        var draws = new CommuteDraws(shape, market, truth, isRounded);
        FixedChunks.Run(shape.Persons, Environment.ProcessorCount, (_, first, end) =>
        {
            var probabilities = new TreeProbabilities(market.Tree, NestedLogitForm.UtilityScaled);
            probabilities.SetDissimilarities([truth[^2], truth[^1], 1]);
            for (var person = first; person < end; person++) draws.Live(person, probabilities);
        });
        return draws;
    }

    private void Live(int person, TreeProbabilities probabilities)
    {
        var J = shape.Alternatives;
        var random = new CounterRandom(20310401, "benchmark panel", person);
        var utility = new double[J];
        var stock = Enumerable.Repeat(1.0 / J, J).ToArray();
        var taste = utility.Select(_ => 0.7 * Normal.Sample(random, 0, 1)).ToArray();
        var isOwned = market.OfferedShare.Select(share => random.NextDouble() < share).ToArray();
        for (var t = 0; t < shape.Occasions; t++)
        {
            var o = (person * shape.Occasions) + t;
            for (var j = 0; j < J; j++)
            {
                // Drawn for every alternative, so that what one person lacks shifts no draw of the others.
                var (time, cost, wait, single) = (Attribute(random, 1, 2, 3), Attribute(random, 0, 2, 2), Attribute(random, 0, 1, 2), Attribute(random, 0, 1, 2));
                if (!isOwned[j]) continue;
                var cell = (o * J) + j;
                Offered[cell] = true;
                (Time[cell], Cost[cell]) = (time, cost);
                Last[cell] = t > 0 && Chosen[o - 1] == j ? 1 : 0;
                var k = J - 1;
                utility[j] = taste[j] + (j == market.Base ? 0 : truth[j - (j > market.Base ? 1 : 0)])
                    + (truth[k++] * time) + (truth[k++] * cost) + (truth[k++] * Last[cell]);
                if (shape.HasStock) utility[j] += truth[k++] * (Stock[cell] = stock[j]);
                var waiting = market.Waiting.IndexOf(j);
                if (waiting >= 0) utility[j] += truth[k] * (Wait[(o * market.Waiting.Length) + waiting] = wait);
                k++;
                var own = market.Single.IndexOf(j);
                if (own >= 0) utility[j] += truth[k + own] * (Single[own][o] = single);
            }

            probabilities.Compute(utility, Offered.AsSpan(o * J, J));
            Chosen[o] = Categorical.Sample(random, probabilities.Probability[..J]);
            for (var j = 0; j < J; j++) stock[j] = (Retention * stock[j]) + (Chosen[o] == j ? 1 - Retention : 0);
        }
    }

    private double Attribute(CounterRandom random, double low, double high, int decimals)
    {
        var value = low + ((high - low) * random.NextDouble());
        return isRounded ? Math.Round(value, decimals) : value;
    }
}
