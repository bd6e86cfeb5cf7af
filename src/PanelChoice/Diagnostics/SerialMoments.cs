using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

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
/// </summary>
internal sealed class SerialMoments
{
    private readonly SituationScores scores;
    private readonly PersonHistory history;
    private readonly MomentLayout layout;
    private readonly MomentSums sums;
    private readonly int[][] members;
    private readonly DateSums? dates;
    private readonly double[][] weighted;
    private readonly double[] work;
    private readonly double[] information;
    private readonly double[] g;
    private readonly double[] e;
    private readonly double[] p;

    private SerialMoments(SituationScores scores, MomentLayout layout, int streams, int[][] members, DateSums? dates)
    {
        this.scores = scores;
        this.layout = layout;
        this.members = members;
        this.dates = dates;
        history = new PersonHistory(streams, layout.Lags, scores.J, scores.K);
        sums = new MomentSums(layout.Count, scores.K);
        weighted = [.. PersonHistory.Decays.Select(_ => new double[scores.J])];
        work = new double[scores.K];
        information = new double[scores.K * scores.K];
        g = new double[scores.J];
        e = new double[scores.J * scores.K];
        p = new double[scores.J];
    }

    /// <summary>Sums the moments of a design.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">The form.</param>
    /// <param name="parameters">All parameters.</param>
    /// <param name="basis">The whitening basis at these parameters.</param>
    /// <param name="positions">Where the situations stand in time.</param>
    /// <param name="lags">Largest lag.</param>
    /// <param name="demeanBy">When given, earlier residuals and predictions are taken as deviations from their date's mean over persons.</param>
    /// <param name="threads">Threads; no figure depends on it.</param>
    public static (MomentLayout Layout, MomentSums Sums) Sum(
        ChoiceDesign design, NestedLogitForm form, ImmutableArray<double> parameters, double[] basis, OccasionPositions positions, int lags,
        DateSums? demeanBy, int threads)
    {
        var members = design.Layout.Nests.Select(n => design.Tree.AlternativesUnder(n.Node).ToArray()).ToArray();
        var layout = new MomentLayout(lags, design.Alternatives, members.Length);
        var parts = new MomentSums[FixedChunks.Count(design.Persons)];
        FixedChunks.Run(design.Persons, threads, (chunk, first, end) =>
        {
            var scores = new SituationScores(design, form, parameters.AsSpan(), basis);
            var pass = new SerialMoments(scores, layout, positions.Streams, members, demeanBy);
            for (var person = first; person < end; person++)
            {
                pass.history.Clear();
                var begin = design.PersonStart[person];
                for (var t = begin; t < design.PersonStart[person + 1]; t++)
                {
                    scores.Load(t);
                    pass.Visit(t, positions.Position(t, begin), positions.Stream(t));
                }
            }

            parts[chunk] = pass.sums;
        });

        var total = parts[0];
        foreach (var part in parts.Skip(1)) total.Add(part);
        return (layout, total);
    }

    private void Visit(int situation, long position, int stream)
    {
        history.MoveTo(position, stream);
        if (!history.IsEmpty)
        {
            AddDecays(stream);
            AddLags(position, stream);
            AddParts();
            AddInformationTrace();
        }

        scores.Residual.CopyTo(g, 0);
        scores.Cross.CopyTo(e, 0);
        scores.Probability.CopyTo(p, 0);
        dates?.Demean(situation, g, e, p);
        history.Push(position, stream, g, e, p, scores);
    }

    private void AddDecays(int stream)
    {
        for (var r = 0; r < PersonHistory.Decays.Length; r++)
        {
            var (z, ez) = history.Decayed(r, stream);
            Add(MomentLayout.Decay(r), z, ez, weighted[r]);
            for (var q = 0; q <= r; q++)
            {
                var covariance = Dot(history.Decayed(q, stream).Residual, weighted[r]);
                sums.DecayCovariance[(r * PersonHistory.Decays.Length) + q] += covariance;
                if (q < r) sums.DecayCovariance[(q * PersonHistory.Decays.Length) + r] += covariance;
            }
        }
    }

    private void AddLags(long position, int stream)
    {
        for (var h = 1; h <= layout.Lags; h++)
        {
            if (history.Back(position, stream, h) is not { } back) continue;
            Add(MomentLayout.Lag(h), back.Residual, back.Cross, weighted[0]);
            if (h == 1) Add(layout.LastPrediction, back.Probability, null, weighted[0]);
        }
    }

    private void Add(int moment, double[] z, double[]? ez, double[] omegaZ)
    {
        scores.ApplyOmega(z, omegaZ);
        sums.Pairs[moment]++;
        sums.Moment[moment] += Dot(z, scores.Residual);
        sums.Variance[moment] += Dot(z, omegaZ);
        if (ez is not null) sums.Bias[moment] += Dot(ez, scores.Cross);
        var row = sums.ScoresOf(moment);
        for (var j = 0; j < z.Length; j++)
            if (z[j] != 0)
                for (var k = 0; k < row.Length; k++) row[k] += z[j] * scores.Cross[(j * scores.K) + k];
    }

    private void AddParts()
    {
        for (var j = 0; j < scores.J; j++) AddPart(layout.Alternative(j), [j]);
        for (var m = 0; m < members.Length; m++) AddPart(layout.Nest(m), members[m]);
    }

    private void AddPart(int moment, ReadOnlySpan<int> part)
    {
        double past = 0, now = 0, variance = 0, bias = 0;
        foreach (var j in part)
        {
            past += history.ResidualTotal[j];
            now += scores.Residual[j];
            foreach (var k in part) variance += scores.OmegaAt(j, k);
        }

        var row = sums.ScoresOf(moment);
        for (var k = 0; k < row.Length; k++)
        {
            double cross = 0, earlier = 0;
            foreach (var j in part)
            {
                cross += scores.Cross[(j * scores.K) + k];
                earlier += history.CrossTotal[(j * scores.K) + k];
            }

            row[k] += past * cross;
            bias += earlier * cross;
        }

        sums.Pairs[moment]++;
        sums.Moment[moment] += past * now;
        sums.Variance[moment] += past * past * variance;
        sums.Bias[moment] += bias;
    }

    private void AddInformationTrace()
    {
        var moment = layout.InformationTrace;
        Array.Clear(information);
        scores.AddInformation(information);
        for (var r = 0; r < scores.K; r++) work[r] = Dot(information.AsSpan(r * scores.K, scores.K), history.ScoreTotal);
        var row = sums.ScoresOf(moment);
        for (var k = 0; k < row.Length; k++) row[k] += work[k];
        sums.Pairs[moment]++;
        sums.Moment[moment] += Dot(history.ScoreTotal, scores.Score);
        sums.Variance[moment] += Dot(history.ScoreTotal, work);
        sums.Bias[moment] += Dot(information, history.InformationTotal);
    }

    private static double Dot(ReadOnlySpan<double> left, ReadOnlySpan<double> right)
    {
        var sum = 0.0;
        for (var k = 0; k < left.Length; k++) sum += left[k] * right[k];
        return sum;
    }
}
