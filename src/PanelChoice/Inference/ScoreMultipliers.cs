using PanelChoice.Numerics;

namespace PanelChoice.Inference;

/// <summary>
/// What the scores of clusters are multiplied with. Signs (Rademacher) have mean 0 and keep the spread of the scores as it is; of G signs there are 2^G sets, and these are
/// all gone through where they are few. Below 13 clusters where they are not, weights of six points make the distribution finer (Webb 2014).
/// </summary>
internal sealed class ScoreMultipliers
{
    /// <summary>Sets of signs up to this number are all gone through, whatever number of draws is asked for.</summary>
    public const int AlwaysEnumerated = 4096;

    private const int FewForSigns = 13;

    private static readonly double[] Points = [-Math.Sqrt(1.5), -1, -Math.Sqrt(0.5), Math.Sqrt(0.5), 1, Math.Sqrt(1.5)];

    private readonly long seed;

    /// <summary>Settles which multipliers are used.</summary>
    /// <param name="clusters">G, 2 or more.</param>
    /// <param name="draws">Draws asked for, 1 or more.</param>
    /// <param name="confidence">Level of intervals: signs that cannot give a p-value of 1 - confidence are too coarse to be of use.</param>
    /// <param name="seed">Seed of the draws.</param>
    public ScoreMultipliers(int clusters, int draws, double confidence, long seed)
    {
        this.seed = seed;
        Clusters = clusters;
        // The statistic of a set is that of its mirror image, so that 2^(1 - G) is the smallest p-value there is.
        var isFineEnough = Math.Pow(2, 1 - clusters) <= 1 - confidence;
        IsEnumerated = isFineEnough && clusters < 31 && 1L << clusters <= Math.Max(draws, AlwaysEnumerated);
        Weights = !IsEnumerated && clusters < FewForSigns ? ScoreWeights.SixPoint : ScoreWeights.Rademacher;
        // Half of the sets: the first sign is +, and mirror images stand for themselves.
        Sets = IsEnumerated ? 1 << (clusters - 1) : draws;
        Draws = IsEnumerated ? 1 << clusters : draws;
    }

    public int Clusters { get; }

    public ScoreWeights Weights { get; }

    public bool IsEnumerated { get; }

    /// <summary>Number of sets to be gone through.</summary>
    public int Sets { get; }

    /// <summary>Number of sets that they stand for.</summary>
    public int Draws { get; }

    /// <summary>One set: a pure function of seed and number, the same for every test and every value that is tested.</summary>
    /// <param name="set">Its number.</param>
    /// <param name="multipliers">Receives G multipliers.</param>
    public void Fill(int set, Span<double> multipliers)
    {
        if (IsEnumerated)
        {
            multipliers[0] = 1;
            for (var g = 1; g < multipliers.Length; g++) multipliers[g] = ((set >> (g - 1)) & 1) == 0 ? 1 : -1;
            return;
        }

        var random = new CounterRandom(seed, "score bootstrap", set);
        if (Weights == ScoreWeights.SixPoint)
        {
            for (var g = 0; g < multipliers.Length; g++) multipliers[g] = Points[random.Next(Points.Length)];
            return;
        }

        var bits = 0u;
        for (var g = 0; g < multipliers.Length; g++)
        {
            if (g % 32 == 0) bits = random.NextUInt32();
            multipliers[g] = (bits & 1) == 0 ? 1 : -1;
            bits >>= 1;
        }
    }
}
