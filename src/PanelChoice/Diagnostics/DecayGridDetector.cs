using System.Collections.Immutable;
using MathNet.Numerics.Distributions;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Numerics;

namespace PanelChoice.Diagnostics;

/// <summary>
/// The detector: the largest z over the grid of decays, each the locally best score against serially correlated (rho below 1) or lasting
/// (rho = 1) utility shocks. Its p-value is the share of seeded draws from N(0, R) whose largest coordinate is as large,
/// (1 + count) / (draws + 1), with R the correlation of the scores.
/// </summary>
internal static class DecayGridDetector
{
    /// <summary>The detector of a battery; null when no decay has any variance (nothing to compare).</summary>
    /// <param name="battery">Scores.</param>
    /// <param name="draws">Number of draws, 1 or more.</param>
    /// <param name="seed">Their seed.</param>
    public static Detector? Of(ScoreBattery battery, int draws, long seed)
    {
        var (defined, correlation) = battery.DecayCorrelation();
        if (defined.IsEmpty) return null;
        ImmutableArray<DecayScore> scores = [.. PersonHistory.Decays.Select((rho, r) => new DecayScore(rho, battery.Decays[r].Z))];
        var statistic = defined.Max(r => scores[r].Z);
        return new Detector(statistic, PValue(statistic, correlation, draws, seed), scores);
    }

    /// <summary>Share of N(0, R) draws whose maximum is at least the statistic.</summary>
    internal static double PValue(double statistic, Matrix<double> correlation, int draws, long seed)
    {
        var size = correlation.RowCount;
        var eigen = correlation.Evd(Symmetricity.Symmetric);
        // R may be singular (two occasions a person make all decays one score), so a root by eigenvectors, not by Cholesky.
        var root = new double[size, size];
        for (var c = 0; c < size; c++)
            for (var r = 0; r < size; r++)
                root[r, c] = eigen.EigenVectors[r, c] * Math.Sqrt(Math.Max(0, eigen.EigenValues[c].Real));

        var random = new CounterRandom(seed, "detector null distribution", 0);
        var normal = new double[size];
        var asLarge = 0;
        for (var draw = 0; draw < draws; draw++)
        {
            for (var c = 0; c < size; c++) normal[c] = Normal.Sample(random, 0, 1);
            var max = double.NegativeInfinity;
            for (var r = 0; r < size; r++)
            {
                var value = 0.0;
                for (var c = 0; c < size; c++) value += root[r, c] * normal[c];
                max = Math.Max(max, value);
            }

            if (max >= statistic) asLarge++;
        }

        return (1.0 + asLarge) / (draws + 1.0);
    }
}
