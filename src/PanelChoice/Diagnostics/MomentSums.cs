namespace PanelChoice.Diagnostics;

/// <summary>
/// Which serial moment stands where: the detector's decays, lags 1 to L, one running sum for each alternative and each nest, the last
/// occasion's prediction, and the information trace.
/// </summary>
/// <param name="Lags">L.</param>
/// <param name="Alternatives">J.</param>
/// <param name="Nests">Number of nests.</param>
internal sealed record MomentLayout(int Lags, int Alternatives, int Nests)
{
    public static int Decay(int index) => index;

    public static int Lag(int lag) => PersonHistory.Decays.Length + lag - 1;

    public int Alternative(int j) => PersonHistory.Decays.Length + Lags + j;

    public int Nest(int nest) => PersonHistory.Decays.Length + Lags + Alternatives + nest;

    public int LastPrediction => PersonHistory.Decays.Length + Lags + Alternatives + Nests;

    public int InformationTrace => LastPrediction + 1;

    public int Count => LastPrediction + 2;
}

/// <summary>
/// Sums over situations of a set of moments m_a = sum z_a' g, in the basis in which A_ss is the identity:
/// their variance A_mm (the decays' full block, else the diagonal), their covariance with the scores A_ms, and their bias b.
/// </summary>
internal sealed class MomentSums
{
    public MomentSums(int moments, int parameters)
    {
        Moment = new double[moments];
        Variance = new double[moments];
        Bias = new double[moments];
        Pairs = new int[moments];
        WithScores = new double[moments * parameters];
        DecayCovariance = new double[PersonHistory.Decays.Length * PersonHistory.Decays.Length];
        Parameters = parameters;
    }

    public int Parameters { get; }

    /// <summary>m_a.</summary>
    public double[] Moment { get; }

    /// <summary>Diagonal of A_mm.</summary>
    public double[] Variance { get; }

    /// <summary>b_a.</summary>
    public double[] Bias { get; }

    /// <summary>Number of situations (for lags: of pairs) that have a z.</summary>
    public int[] Pairs { get; }

    /// <summary>A_ms, one row of K for each moment.</summary>
    public double[] WithScores { get; }

    /// <summary>A_mm of the decays.</summary>
    public double[] DecayCovariance { get; }

    /// <summary>The row of A_ms of a moment.</summary>
    public Span<double> ScoresOf(int moment) => WithScores.AsSpan(moment * Parameters, Parameters);

    /// <summary>Adds another set of sums.</summary>
    public void Add(MomentSums other)
    {
        Sum(Moment, other.Moment);
        Sum(Variance, other.Variance);
        Sum(Bias, other.Bias);
        Sum(WithScores, other.WithScores);
        Sum(DecayCovariance, other.DecayCovariance);
        for (var k = 0; k < Pairs.Length; k++) Pairs[k] += other.Pairs[k];
    }

    /// <summary>Adds one moment's sums to another's, but for the variance and the number of pairs.</summary>
    public void Include(int moment, int of)
    {
        Moment[moment] += Moment[of];
        Bias[moment] += Bias[of];
        Sum(ScoresOf(moment), ScoresOf(of));
    }

    private static void Sum(Span<double> into, ReadOnlySpan<double> from)
    {
        for (var k = 0; k < into.Length; k++) into[k] += from[k];
    }
}
