using PanelChoice.Design;
using PanelChoice.Numerics;

namespace PanelChoice.Estimation;

/// <summary>What one person's or cluster's situations can say about a parameter taken alone.</summary>
[Flags]
internal enum Evidence : byte
{
    /// <summary>Nothing: the column does not vary inside a choice set; the nest is never two wide.</summary>
    None = 0,

    /// <summary>The column varies inside some choice set; the nest is two or more wide in some situation.</summary>
    Varies = 1,

    /// <summary>Some chosen alternative has more of the column than another that was offered.</summary>
    ChosenHasMore = 2,

    /// <summary>Some chosen alternative has less of the column than another that was offered.</summary>
    ChosenHasLess = 4,
}

/// <summary>
/// One pass over the sample that sees each column alone, inside choice sets, without any likelihood: whether it varies, how much (the
/// scale the optimiser works in), and whether every choice goes one way along it. A coefficient whose column never goes against the
/// choices (or never with them) has no finite maximum, whatever else is in the model (Albert and Anderson 1984).
/// </summary>
internal sealed class ColumnSurvey
{
    /// <summary>Differences below this share of the largest value in the choice set are rounding.</summary>
    private const double Rounding = 1e-10;

    private readonly Evidence[] byCluster;
    private readonly int K;

    private ColumnSurvey(double[] scale, Evidence[] byCluster, bool[] isEverChosen, int parameters)
    {
        Scale = scale;
        this.byCluster = byCluster;
        IsEverChosen = isEverChosen;
        K = parameters;
    }

    /// <summary>Standard deviation of each coefficient's column inside choice sets; 1 where it does not vary, and for dissimilarities.</summary>
    public double[] Scale { get; }

    /// <summary>Whether each alternative is chosen anywhere in the sample.</summary>
    public bool[] IsEverChosen { get; }

    /// <summary>Evidence on each parameter in the whole sample.</summary>
    public Evidence[] Whole() => Of(Enumerable.Repeat(1.0, byCluster.Length / Math.Max(1, K)).ToArray());

    /// <summary>Evidence on each parameter in the clusters with positive weight.</summary>
    /// <param name="clusterWeight">Weight of each cluster.</param>
    public Evidence[] Of(ReadOnlySpan<double> clusterWeight)
    {
        var evidence = new Evidence[K];
        for (var g = 0; g < clusterWeight.Length; g++)
        {
            if (clusterWeight[g] <= 0) continue;
            for (var k = 0; k < K; k++) evidence[k] |= byCluster[(g * K) + k];
        }

        return evidence;
    }

    /// <summary>Surveys a design.</summary>
    /// <param name="design">The design.</param>
    /// <param name="threads">Threads, 1 or more; the result does not depend on it.</param>
    public static ColumnSurvey Of(ChoiceDesign design, int threads)
    {
        var K = design.Layout.Count;
        var columns = design.Columns.GroupBy(c => c.Parameter).OrderBy(g => g.Key).Select(g => (g.Key, Columns: g.ToArray())).ToArray();
        var chunks = FixedChunks.Count(design.Blocks.Length);
        var squares = new double[chunks][];
        var cells = new long[chunks];
        var byPerson = new Evidence[design.Persons * K];
        FixedChunks.Run(design.Blocks.Length, threads, (chunk, first, end) =>
        {
            squares[chunk] = new double[K];
            for (var b = first; b < end; b++)
            {
                var block = design.Blocks[b];
                foreach (var (k, own) in columns) squares[chunk][k] += SurveyColumn(design, block, k, own, byPerson);
                cells[chunk] += SurveyNests(design, block, byPerson);
            }
        });

        var scale = Enumerable.Repeat(1.0, K).ToArray();
        var total = cells.Sum();
        foreach (var (k, _) in columns)
        {
            var sum = 0.0;
            foreach (var part in squares) sum += part[k];
            if (sum > 0) scale[k] = Math.Sqrt(sum / total);
        }

        var byCluster = new Evidence[design.Clusters.Length * K];
        for (var p = 0; p < design.Persons; p++)
            for (var k = 0; k < K; k++) byCluster[(design.ClusterOf[p] * K) + k] |= byPerson[(p * K) + k];
        var chosen = new bool[design.Alternatives];
        foreach (var j in design.Chosen) chosen[j] = true;
        return new ColumnSurvey(scale, byCluster, chosen, K);
    }

    /// <summary>Marks the evidence of one column and returns its squared deviations from the mean of the choice set.</summary>
    private static double SurveyColumn(ChoiceDesign design, DesignBlock block, int k, DesignColumn[] own, Evidence[] byPerson)
    {
        var J = design.Alternatives;
        var K = design.Layout.Count;
        var values = new double[J];
        var squares = 0.0;
        for (var lane = 0; lane < block.Situations; lane++)
        {
            var situation = block.FirstSituation + lane;
            Array.Clear(values);
            foreach (var c in own) values[c.Alternative] = c.Storage < 0 ? 1 : design.Data[block.DataOffset + (c.Storage * block.Lanes) + lane];

            var mask = block.MaskOffset + (lane / ChoiceDesign.TileLanes * J);
            var bit = 1 << (lane % ChoiceDesign.TileLanes);
            var offered = 0;
            double sum = 0, min = double.PositiveInfinity, max = double.NegativeInfinity;
            for (var j = 0; j < J; j++)
            {
                if ((design.Offered[mask + j] & bit) == 0) continue;
                offered++;
                sum += values[j];
                min = Math.Min(min, values[j]);
                max = Math.Max(max, values[j]);
            }

            var rounding = Rounding * Math.Max(Math.Abs(min), Math.Abs(max));
            if (!(max - min > rounding)) continue;
            var mean = sum / offered;
            for (var j = 0; j < J; j++)
                if ((design.Offered[mask + j] & bit) != 0) squares += (values[j] - mean) * (values[j] - mean);
            var chosen = values[design.Chosen[situation]];
            var evidence = Evidence.Varies;
            if (chosen - min > rounding) evidence |= Evidence.ChosenHasMore;
            if (max - chosen > rounding) evidence |= Evidence.ChosenHasLess;
            byPerson[(design.PersonOf[situation] * K) + k] |= evidence;
        }

        return squares;
    }

    /// <summary>Marks the nests that are two or more wide and returns the number of offered alternatives.</summary>
    private static long SurveyNests(ChoiceDesign design, DesignBlock block, Evidence[] byPerson)
    {
        var J = design.Alternatives;
        var K = design.Layout.Count;
        var nodes = design.Tree.Nodes;
        var any = new bool[J + nodes.Length];
        long cells = 0;
        for (var lane = 0; lane < block.Situations; lane++)
        {
            var person = design.PersonOf[block.FirstSituation + lane];
            var mask = block.MaskOffset + (lane / ChoiceDesign.TileLanes * J);
            var bit = 1 << (lane % ChoiceDesign.TileLanes);
            for (var j = 0; j < J; j++)
            {
                any[j] = (design.Offered[mask + j] & bit) != 0;
                if (any[j]) cells++;
            }

            for (var n = 0; n < nodes.Length; n++)
            {
                var width = 0;
                foreach (var c in nodes[n].Children) if (any[c]) width++;
                any[J + n] = width > 0;
                if (width > 1 && design.Layout.NodeParameter[n] is var k && k >= 0) byPerson[(person * K) + k] |= Evidence.Varies;
            }
        }

        return cells;
    }
}
