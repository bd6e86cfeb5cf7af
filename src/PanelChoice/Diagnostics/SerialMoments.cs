using System.Runtime.Intrinsics;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;

namespace PanelChoice.Diagnostics;

/// <summary>
/// Sums the serial moments over the persons of a design, situation by situation in one forward pass. With z predetermined (a function of
/// the person's earlier situations), Omega = Cov(g, g), E = Cov(g, s) and I = Cov(s, s) of the situation and A_ss = identity in the basis:
/// <code>
/// m += z'g     A_mm += z' Omega z     A_ms += E'z     b += sum of the elementwise product of Ez and E     (Ez: the filter of z applied to E)
/// alternative j   z = e_j G_j,  nest m   z_j = 1[j in m] sum_{k in m} G_k     with G the sum of earlier g
/// last prediction z = P of the situation one step back; its bias is 0
/// information     m += S's,  A_mm += S'IS,  A_ms += IS,  b += tr(I sum of earlier I)     with S the sum of earlier s
/// </code>
/// The bias: fitted residuals satisfy sum s = 0, so that products of residuals of different occasions have a mean below 0 of second order.
/// R(0) is lag 1, and R(1) is the sum over alternatives but for its variance: neither is summed twice.
/// </summary>
internal sealed class SerialMoments
{
    private const int Lanes = PaddedRows.Lanes;
    private static readonly int Decays = PersonHistory.Decays.Length;

    private readonly SituationScores scores;
    private readonly PersonHistory history;
    private readonly OccasionPositions positions;
    private readonly MomentLayout layout;
    private readonly int[][] members;
    private readonly DateSums? dates;

    /// <summary>Sums of which the lanes are not added up yet, one vector for each moment: m, A_mm, b; A_mm of pairs of decays.</summary>
    private readonly Vector512<double>[] moment;
    private readonly Vector512<double>[] variance;
    private readonly Vector512<double>[] bias;
    private readonly Vector512<double>[] decayCovariance;
    private readonly double[] withScores;
    private readonly int[] pairs;

    private readonly double[][] decayed;
    private readonly double[][] weighted;
    private readonly double[] nothing;
    private readonly double[] work;
    private readonly double[] together;
    private readonly double[] earlier;
    private readonly double[] g;
    private readonly double[] e;
    private readonly double[] p;

    private SerialMoments(SituationScores scores, OccasionPositions positions, MomentLayout layout, int[][] members, DateSums? dates)
    {
        this.scores = scores;
        this.positions = positions;
        this.layout = layout;
        this.members = members;
        this.dates = dates;
        var cells = scores.J * scores.Width;
        history = new PersonHistory(positions.Streams, layout.Lags, scores.ResidualWidth, cells, scores.Width);
        moment = new Vector512<double>[layout.Count];
        variance = new Vector512<double>[layout.Count];
        bias = new Vector512<double>[layout.Count];
        decayCovariance = new Vector512<double>[Decays * Decays];
        withScores = new double[layout.Count * scores.Width];
        pairs = new int[layout.Count];
        nothing = new double[scores.ResidualWidth];
        decayed = new double[Decays][];
        weighted = [.. PersonHistory.Decays.Select(_ => new double[scores.ResidualWidth])];
        work = new double[scores.Width];
        together = new double[scores.Width];
        earlier = new double[scores.Width];
        g = new double[scores.ResidualWidth];
        e = new double[cells];
        p = new double[scores.ResidualWidth];
    }

    /// <summary>Sums the moments of a design.</summary>
    /// <param name="kernel">The design's residuals.</param>
    /// <param name="basis">The whitening basis at the same parameters.</param>
    /// <param name="positions">Where the situations stand in time.</param>
    /// <param name="lags">Largest lag, 1 or more.</param>
    /// <param name="demeanBy">When given, earlier residuals and predictions are taken as deviations from their date's mean over persons.</param>
    /// <param name="threads">Threads; no figure depends on it.</param>
    public static (MomentLayout Layout, MomentSums Sums) Sum(
        ResidualKernel kernel, double[] basis, OccasionPositions positions, int lags, DateSums? demeanBy, int threads)
    {
        var design = kernel.Layout.Design;
        var members = design.Layout.Nests.Select(n => design.Tree.AlternativesUnder(n.Node).ToArray()).ToArray();
        var layout = new MomentLayout(lags, design.Alternatives, members.Length);
        var parts = new MomentSums[FixedChunks.Count(design.Blocks.Length)];
        kernel.ForEachChunk(threads, (residuals, chunk, first, end) =>
        {
            var pass = new SerialMoments(new SituationScores(residuals, basis), positions, layout, members, demeanBy);
            for (var b = first; b < end; b++) pass.Add(design, design.Blocks[b]);
            parts[chunk] = pass.Sums();
        });

        var total = parts[0];
        foreach (var part in parts.Skip(1)) total.Add(part);
        return (layout, total);
    }

    /// <summary>Adds the persons of a block.</summary>
    private void Add(ChoiceDesign design, DesignBlock block)
    {
        var person = design.PersonOf[block.FirstSituation] - 1;
        var (begin, next) = (0, block.FirstSituation);
        scores.ForEach(block, t =>
        {
            if (t == next)
            {
                person++;
                (begin, next) = (t, design.PersonStart[person + 1]);
                history.Clear();
            }

            Visit(t, positions.Position(t, begin), positions.Stream(t));
        });
    }

    private void Visit(int situation, long position, int stream)
    {
        history.MoveTo(position, stream);
        scores.SetInformation();
        if (!history.IsEmpty)
        {
            AddLags(position, stream);
            AddDecays(stream);
            AddParts();
            AddInformationTrace();
        }

        scores.Residual.AsSpan(0, scores.J).CopyTo(g);
        scores.Cross.CopyTo(e);
        scores.Probability.AsSpan(0, scores.J).CopyTo(p);
        dates?.Demean(situation, g, e, p);
        history.Push(position, stream, g, e, p, scores.Score);
        PaddedRows.Add(1, scores.Information, history.InformationTotal);
    }

    private void AddLags(long position, int stream)
    {
        decayed[0] = nothing;
        for (var h = 1; h <= layout.Lags; h++)
        {
            if (history.Back(position, stream, h) is not { } back) continue;
            Add(MomentLayout.Lag(h), back.Residual, back.Cross, weighted[0]);
            if (h != 1) continue;
            decayed[0] = back.Residual;
            Add(layout.LastPrediction, back.Probability, [], weighted[0]);
        }
    }

    private void AddDecays(int stream)
    {
        for (var r = 1; r < Decays - 1; r++)
        {
            var filter = history.Decayed(r, stream);
            decayed[r] = filter.Residual;
            Add(MomentLayout.Decay(r), filter.Residual, filter.Cross, weighted[r]);
        }

        var all = Decays - 1;
        decayed[all] = history.Total.Residual;
        ApplyOmega(decayed[all], weighted[all]);
        pairs[MomentLayout.Decay(0)]++;
        pairs[MomentLayout.Decay(all)]++;
        for (var r = 0; r < Decays; r++)
            for (var q = Math.Max(1, r); q < Decays; q++) decayCovariance[(q * Decays) + r] += PaddedRows.DotByLane(decayed[r], weighted[q]);
    }

    private void Add(int at, double[] z, ReadOnlySpan<double> ez, double[] omegaZ)
    {
        pairs[at]++;
        ApplyOmega(z, omegaZ);
        moment[at] += PaddedRows.DotByLane(z, scores.Residual);
        variance[at] += PaddedRows.DotByLane(z, omegaZ);
        if (!ez.IsEmpty) bias[at] += PaddedRows.DotByLane(ez, scores.Cross);
        PaddedRows.AddCombination(z, scores.Cross, scores.J, RowOf(at));
    }

    /// <summary>Omega z. What stands behind the first J is of no account: z is 0 there.</summary>
    private void ApplyOmega(double[] z, double[] omegaZ)
    {
        Array.Clear(omegaZ);
        PaddedRows.AddCombination(z, scores.Omega, scores.J, omegaZ);
    }

    private void AddParts()
    {
        var width = scores.Width;
        var past = history.Total.Residual;
        for (var j = 0; j < scores.J; j++)
        {
            var at = layout.Alternative(j);
            var row = scores.Cross.Slice(j * width, width);
            pairs[at]++;
            moment[at] += Vector512.CreateScalar(past[j] * scores.Residual[j]);
            variance[at] += Vector512.CreateScalar(past[j] * past[j] * scores.OmegaAt(j, j));
            bias[at] += PaddedRows.DotByLane(history.Total.Cross.AsSpan(j * width, width), row);
            PaddedRows.Add(past[j], row, RowOf(at));
        }

        for (var m = 0; m < members.Length; m++) AddNest(layout.Nest(m), members[m]);
    }

    private void AddNest(int at, int[] nest)
    {
        double past = 0, now = 0, omega = 0;
        Array.Clear(together);
        Array.Clear(earlier);
        foreach (var j in nest)
        {
            past += history.Total.Residual[j];
            now += scores.Residual[j];
            PaddedRows.Add(1, scores.Cross.Slice(j * scores.Width, scores.Width), together);
            PaddedRows.Add(1, history.Total.Cross.AsSpan(j * scores.Width, scores.Width), earlier);
            foreach (var k in nest) omega += scores.OmegaAt(j, k);
        }

        pairs[at]++;
        moment[at] += Vector512.CreateScalar(past * now);
        variance[at] += Vector512.CreateScalar(past * past * omega);
        bias[at] += PaddedRows.DotByLane(earlier, together);
        PaddedRows.Add(past, together, RowOf(at));
    }

    private void AddInformationTrace()
    {
        var at = layout.InformationTrace;
        scores.ApplyInformation(history.ScoreTotal, work);
        pairs[at]++;
        moment[at] += PaddedRows.DotByLane(history.ScoreTotal, scores.Score);
        variance[at] += PaddedRows.DotByLane(history.ScoreTotal, work);
        bias[at] += PaddedRows.SymmetricDotByLane(scores.Information, history.InformationTotal, scores.Width);
        PaddedRows.Add(1, work, RowOf(at));
    }

    private Span<double> RowOf(int at) => withScores.AsSpan(at * scores.Width, scores.Width);

    /// <summary>What was added, lanes added up.</summary>
    private MomentSums Sums()
    {
        var sums = new MomentSums(layout.Count, scores.K);
        for (var at = 0; at < layout.Count; at++)
        {
            sums.Moment[at] = Vector512.Sum(moment[at]);
            sums.Variance[at] = Vector512.Sum(variance[at]);
            sums.Bias[at] = Vector512.Sum(bias[at]);
            sums.Pairs[at] = pairs[at];
            RowOf(at)[..scores.K].CopyTo(sums.ScoresOf(at));
        }

        var (first, last) = (MomentLayout.Decay(0), MomentLayout.Decay(Decays - 1));
        sums.Include(first, MomentLayout.Lag(1));
        for (var j = 0; j < scores.J; j++) sums.Include(last, layout.Alternative(j));
        sums.DecayCovariance[0] = sums.Variance[MomentLayout.Lag(1)];
        for (var r = 0; r < Decays; r++)
            for (var q = Math.Max(1, r); q < Decays; q++)
                sums.DecayCovariance[(q * Decays) + r] = sums.DecayCovariance[(r * Decays) + q] = Vector512.Sum(decayCovariance[(q * Decays) + r]);
        sums.Variance[first] = sums.DecayCovariance[0];
        sums.Variance[last] = sums.DecayCovariance[(Decays * Decays) - 1];
        return sums;
    }
}
