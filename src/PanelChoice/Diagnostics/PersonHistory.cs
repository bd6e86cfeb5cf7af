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
/// number of weeks apart have a distance; lasting taste (rho = 1) has no distance and takes every earlier situation. Rows are padded with zeros
/// (<see cref="PaddedRows"/>).
/// </summary>
internal sealed class PersonHistory
{
    /// <summary>Decays of the detector's grid; the first is 0 and the last is 1.</summary>
    public static readonly double[] Decays = [0, 0.3, 0.6, 0.8, 0.9, 1];

    private readonly int lags;
    private readonly Filter[][] filters;
    private readonly long[] lastPosition;
    private readonly bool[] started;
    private readonly Recent[] recent;

    /// <summary>A history without anything in it.</summary>
    /// <param name="streams">Number of streams.</param>
    /// <param name="lags">Situations this far back are kept; 1 at least.</param>
    /// <param name="residuals">Length of a row of residuals.</param>
    /// <param name="cells">Length of E.</param>
    /// <param name="scores">Length of a row of scores.</param>
    public PersonHistory(int streams, int lags, int residuals, int cells, int scores)
    {
        this.lags = Math.Max(1, lags);
        filters = [.. Enumerable.Range(0, streams).Select(_ => Enumerable.Range(1, Decays.Length - 2).Select(r => new Filter(Decays[r], residuals, cells)).ToArray())];
        lastPosition = new long[streams];
        started = new bool[streams];
        recent = [.. Enumerable.Range(0, this.lags * streams).Select(_ => new Recent(residuals, cells))];
        Total = new Filter(1, residuals, cells);
        ScoreTotal = new double[scores];
        InformationTotal = new double[scores * scores];
    }

    /// <summary>Sums over all earlier situations: R(1).</summary>
    public Filter Total { get; }

    /// <summary>Sum of s over all earlier situations.</summary>
    public double[] ScoreTotal { get; }

    /// <summary>Sum of I over all earlier situations.</summary>
    public double[] InformationTotal { get; }

    /// <summary>Whether there is any earlier situation.</summary>
    public bool IsEmpty { get; private set; } = true;

    /// <summary>Forgets everything: the next person.</summary>
    public void Clear()
    {
        IsEmpty = true;
        for (var stream = 0; stream < started.Length; stream++)
        {
            if (!started[stream]) continue;
            started[stream] = false;
            foreach (var filter in filters[stream]) filter.Clear();
            foreach (var slot in recent.AsSpan(stream * lags, lags)) slot.IsSet = false;
        }

        Total.Clear();
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
        foreach (var filter in filters[stream]) filter.Fade(gap - 1);
    }

    /// <summary>R(rho) at the present situation for a decay between 0 and 1 that stands at the given place of <see cref="Decays"/>.</summary>
    public Filter Decayed(int decay, int stream) => filters[stream][decay - 1];

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
    /// <param name="g">Residual that later situations meet.</param>
    /// <param name="e">E that goes with it.</param>
    /// <param name="probability">P that later situations meet.</param>
    /// <param name="score">Its score.</param>
    public void Push(long position, int stream, ReadOnlySpan<double> g, ReadOnlySpan<double> e, ReadOnlySpan<double> probability, ReadOnlySpan<double> score)
    {
        foreach (var filter in filters[stream]) filter.Fold(g, e);
        Total.Fold(g, e);
        PaddedRows.Add(1, score, ScoreTotal);
        lastPosition[stream] = position;
        started[stream] = true;
        IsEmpty = false;

        var slot = recent[(stream * lags) + (int)(position % lags)];
        slot.IsSet = true;
        slot.Position = position;
        g.CopyTo(slot.Residual);
        e.CopyTo(slot.Cross);
        probability.CopyTo(slot.Probability);
    }

    /// <summary>Running sums of residuals and of E under one decay.</summary>
    internal sealed class Filter(double decay, int residuals, int cells)
    {
        public double[] Residual { get; } = new double[residuals];

        public double[] Cross { get; } = new double[cells];

        public void Clear()
        {
            Array.Clear(Residual);
            Array.Clear(Cross);
        }

        public void Fade(long steps)
        {
            var factor = Math.Pow(decay, steps);
            foreach (ref var x in Residual.AsSpan()) x *= factor;
            foreach (ref var x in Cross.AsSpan()) x *= factor;
        }

        public void Fold(ReadOnlySpan<double> g, ReadOnlySpan<double> e)
        {
            PaddedRows.Fold(decay, Residual, g);
            PaddedRows.Fold(decay, Cross, e);
        }
    }

    /// <summary>One recent situation.</summary>
    internal sealed class Recent(int residuals, int cells)
    {
        public bool IsSet { get; set; }

        public long Position { get; set; }

        public double[] Residual { get; } = new double[residuals];

        public double[] Probability { get; } = new double[residuals];

        public double[] Cross { get; } = new double[cells];
    }
}
