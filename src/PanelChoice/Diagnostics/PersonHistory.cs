namespace PanelChoice.Diagnostics;

/// <summary>
/// What one person's earlier situations come to at the present one: the predetermined weights z of every serial moment and, under the same
/// linear filter, the matrices E that its bias correction needs. Everything is a running sum, so that a situation costs the same
/// however long the person's record is.
/// <code>
/// R(rho)  z = sum over s before t of rho^(d_ts - 1) g_s      c := (rho c + g_prev) rho^(gap - 1);  0^0 = 1, so R(0) is lag 1
/// lag h   z = g of the situation exactly h steps back, if it is in the sample
/// </code>
/// Positions are whole steps, not negative and rising within a stream. Under the weekly rule a person has one stream for each day of the week, because only situations a whole
/// number of weeks apart have a distance; lasting taste (rho = 1) has no distance and takes every earlier situation.
/// </summary>
internal sealed class PersonHistory
{
    /// <summary>Decays of the detector's grid; the last is 1.</summary>
    public static readonly double[] Decays = [0, 0.3, 0.6, 0.8, 0.9, 1];

    private readonly int streams;
    private readonly int lags;
    private readonly int J;
    private readonly int cells;
    private readonly double[][] residual;
    private readonly double[][] cross;
    private readonly long[] lastPosition;
    private readonly bool[] started;
    private readonly Recent[] recent;
    private int seen;

    public PersonHistory(int streams, int lags, int alternatives, int parameters)
    {
        this.streams = streams;
        this.lags = Math.Max(1, lags);
        J = alternatives;
        cells = alternatives * parameters;
        var filters = streams * (Decays.Length - 1);
        residual = Arrays(filters, J);
        cross = Arrays(filters, cells);
        lastPosition = new long[streams];
        started = new bool[streams];
        recent = [.. Enumerable.Range(0, this.lags * streams).Select(_ => new Recent(new double[J], new double[J], new double[cells]))];
        ResidualTotal = new double[J];
        CrossTotal = new double[cells];
        ScoreTotal = new double[parameters];
        InformationTotal = new double[parameters * parameters];
    }

    /// <summary>Sum of g over all earlier situations (J).</summary>
    public double[] ResidualTotal { get; }

    /// <summary>Sum of E over all earlier situations (J x K).</summary>
    public double[] CrossTotal { get; }

    /// <summary>Sum of s over all earlier situations (K).</summary>
    public double[] ScoreTotal { get; }

    /// <summary>Sum of I over all earlier situations (K x K).</summary>
    public double[] InformationTotal { get; }

    /// <summary>Whether there is any earlier situation.</summary>
    public bool IsEmpty => seen == 0;

    /// <summary>Forgets everything: the next person.</summary>
    public void Clear()
    {
        seen = 0;
        Array.Clear(started);
        foreach (var r in recent) r.IsSet = false;
        foreach (var r in residual) Array.Clear(r);
        foreach (var c in cross) Array.Clear(c);
        Array.Clear(ResidualTotal);
        Array.Clear(CrossTotal);
        Array.Clear(ScoreTotal);
        Array.Clear(InformationTotal);
    }

    /// <summary>Moves to the present situation: what was seen fades by its distance.</summary>
    public void MoveTo(long position, int stream)
    {
        if (!started[stream]) return;
        var gap = position - lastPosition[stream];
        lastPosition[stream] = position;
        if (gap == 1) return;
        for (var r = 0; r + 1 < Decays.Length; r++)
        {
            var fade = Math.Pow(Decays[r], gap - 1);
            foreach (ref var x in residual[Filter(stream, r)].AsSpan()) x *= fade;
            foreach (ref var x in cross[Filter(stream, r)].AsSpan()) x *= fade;
        }
    }

    /// <summary>z and the filtered E of R(rho) at the present situation.</summary>
    public (double[] Residual, double[] Cross) Decayed(int decay, int stream) =>
        decay == Decays.Length - 1 ? (ResidualTotal, CrossTotal) : (residual[Filter(stream, decay)], cross[Filter(stream, decay)]);

    /// <summary>The situation exactly <paramref name="lag"/> steps back (at most the lags kept); null when it is not in the sample.</summary>
    public Recent? Back(long position, int stream, int lag)
    {
        if (position < lag) return null;
        var slot = recent[(stream * lags) + (int)((position - lag) % lags)];
        return slot.IsSet && slot.Position == position - lag ? slot : null;
    }

    /// <summary>Adds the present situation to the past.</summary>
    /// <param name="position">Its position.</param>
    /// <param name="stream">Its stream.</param>
    /// <param name="g">Residual that later situations meet (J).</param>
    /// <param name="e">E that goes with it (J x K).</param>
    /// <param name="probability">P that later situations meet (J).</param>
    /// <param name="scores">The loaded situation: score and information.</param>
    public void Push(long position, int stream, ReadOnlySpan<double> g, ReadOnlySpan<double> e, ReadOnlySpan<double> probability, SituationScores scores)
    {
        for (var r = 0; r + 1 < Decays.Length; r++)
        {
            Fold(Decays[r], residual[Filter(stream, r)], g);
            Fold(Decays[r], cross[Filter(stream, r)], e);
        }

        Fold(1, ResidualTotal, g);
        Fold(1, CrossTotal, e);
        Fold(1, ScoreTotal, scores.Score);
        scores.AddInformation(InformationTotal);
        lastPosition[stream] = position;
        started[stream] = true;
        seen++;

        var slot = recent[(stream * lags) + (int)(position % lags)];
        slot.IsSet = true;
        slot.Position = position;
        g.CopyTo(slot.Residual);
        e.CopyTo(slot.Cross);
        probability.CopyTo(slot.Probability);
    }

    private int Filter(int stream, int decay) => (decay * streams) + stream;

    private static void Fold(double factor, double[] sum, ReadOnlySpan<double> add)
    {
        for (var k = 0; k < sum.Length; k++) sum[k] = (factor * sum[k]) + add[k];
    }

    private static double[][] Arrays(int count, int length) => [.. Enumerable.Range(0, count).Select(_ => new double[length])];

    /// <summary>One recent situation.</summary>
    internal sealed class Recent(double[] residual, double[] probability, double[] cross)
    {
        public bool IsSet { get; set; }

        public long Position { get; set; }

        public double[] Residual { get; } = residual;

        public double[] Probability { get; } = probability;

        public double[] Cross { get; } = cross;
    }
}
