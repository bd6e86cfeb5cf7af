using PanelChoice.Likelihood;

namespace PanelChoice.Simulation;

/// <summary>Writes utilities and availability of one occasion, given the choices simulated before it.</summary>
/// <param name="occasion">Index of the occasion.</param>
/// <param name="chosen">Alternatives chosen at the occasions before it, in order.</param>
/// <param name="utility">Receives V of the J alternatives.</param>
/// <param name="offered">Receives which alternatives are offered; at least one.</param>
internal delegate void OccasionUtilities(int occasion, ReadOnlySpan<int> chosen, Span<double> utility, Span<bool> offered);

/// <summary>
/// One person's choices forward in time from known parameters: every lag is fed by the choices simulated before. Each occasion takes exactly
/// one uniform draw, so that two simulations from one stream differ only where their probabilities do.
/// </summary>
internal static class ForwardChoices
{
    /// <summary>Simulates a stretch of occasions.</summary>
    /// <param name="probabilities">Work space with the dissimilarities set.</param>
    /// <param name="occasions">Number of occasions.</param>
    /// <param name="random">The person's stream.</param>
    /// <param name="write">Gives utilities and availability.</param>
    /// <returns>The alternative chosen at each occasion.</returns>
    public static int[] Simulate(TreeProbabilities probabilities, int occasions, Random random, OccasionUtilities write)
    {
        var alternatives = probabilities.Tree.Alternatives.Length;
        var utility = new double[alternatives];
        var offered = new bool[alternatives];
        var chosen = new int[occasions];
        for (var t = 0; t < occasions; t++)
        {
            write(t, chosen.AsSpan(0, t), utility, offered);
            probabilities.Compute(utility, offered);
            chosen[t] = Draw(probabilities, random.NextDouble());
        }

        return chosen;
    }

    /// <summary>The alternative in whose stretch of the distribution function a uniform draw falls.</summary>
    /// <param name="probabilities">Probabilities as last computed.</param>
    /// <param name="uniform">A number inside (0, 1).</param>
    public static int Draw(TreeProbabilities probabilities, double uniform)
    {
        var last = -1;
        for (var j = 0; j < probabilities.Tree.Alternatives.Length; j++)
        {
            if (!probabilities.IsOffered(j)) continue;
            last = j;
            uniform -= probabilities.Probability[j];
            if (uniform < 0) return j;
        }

        // Rounding can leave a sliver above the sum of the probabilities: it belongs to the last alternative.
        return last;
    }
}
