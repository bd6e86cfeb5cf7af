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
        var chunks = FixedChunks.Count(design.Blocks.Length);
        var squares = new double[chunks][];
        var cells = new long[chunks];
        var byPerson = new Evidence[design.Persons * K];
        var chosen = new bool[design.Alternatives];
        FixedChunks.Run(design.Blocks.Length, threads, (chunk, first, end) =>
        {
            squares[chunk] = new double[K];
            var survey = new BlockSurvey(design);
            for (var b = first; b < end; b++) cells[chunk] += survey.Add(design.Blocks[b], squares[chunk], byPerson, chosen);
        });

        var scale = Enumerable.Repeat(1.0, K).ToArray();
        var total = cells.Sum();
        for (var k = 0; k < design.Layout.Coefficients; k++)
        {
            var sum = 0.0;
            foreach (var part in squares) sum += part[k];
            if (sum > 0) scale[k] = Math.Sqrt(sum / total);
        }

        var byCluster = new Evidence[design.Clusters.Length * K];
        for (var p = 0; p < design.Persons; p++)
            for (var k = 0; k < K; k++) byCluster[(design.ClusterOf[p] * K) + k] |= byPerson[(p * K) + k];
        return new ColumnSurvey(scale, byCluster, chosen, K);
    }
}
