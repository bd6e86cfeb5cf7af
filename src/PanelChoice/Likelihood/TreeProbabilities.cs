using PanelChoice.Study;

namespace PanelChoice.Likelihood;

/// <summary>
/// Probabilities of one situation on a nest tree of any depth, with the derivatives of log P by utilities and dissimilarities
/// (McFadden 1978; the tree recursion is the standard one). Plain scalar code: it is what the fast kernel is checked against, and what the
/// diagnostics enumerate hypothetical choices with.
/// <code>
/// utility-scaled   W_m = l_m log sum_c exp(W_c / l_m)    P(c|m) = exp((W_c - W_m) / l_m)    log P(j) = sum over the path of (W_child - W_m) / l_m
/// unscaled         L_m = log sum_c exp(W_c)  W_m = l_m L_m   P(c|m) = exp(W_c - L_m)        log P(j) = sum over the path of W_child - L_m
/// </code>
/// Symbols: J alternatives; children are numbered as in <see cref="NestTree"/>; W value of a node, p its probability inside its parent,
/// E entropy of the choice inside a node, L log-sum.
/// One instance is a work space: it is not for use by several threads at once.
/// </summary>
internal sealed class TreeProbabilities
{
    private readonly NestTree tree;
    private readonly int J;
    private readonly double[] l;
    private readonly double[] logSum;
    private readonly bool[] any;

    public TreeProbabilities(NestTree tree, NestedLogitForm form)
    {
        this.tree = tree;
        Form = form;
        J = tree.Alternatives.Length;
        var children = J + tree.Nodes.Length;
        Value = new double[children];
        Conditional = new double[children];
        LogConditional = new double[children];
        Probability = new double[children];
        Entropy = new double[tree.Nodes.Length];
        l = new double[tree.Nodes.Length];
        logSum = new double[tree.Nodes.Length];
        any = new bool[children];
        Parent = new int[children];
        Parent[J + tree.Root] = -1;
        for (var n = 0; n < tree.Nodes.Length; n++)
            foreach (var c in tree.Nodes[n].Children) Parent[c] = n;
    }

    public NestedLogitForm Form { get; }

    public NestTree Tree => tree;

    /// <summary>W of each child number (the root is the last).</summary>
    public double[] Value { get; }

    /// <summary>p: probability of each child inside its parent; 0 where nothing is offered.</summary>
    public double[] Conditional { get; }

    /// <summary>log p of each offered child; it stays finite where p has become 0.</summary>
    public double[] LogConditional { get; }

    /// <summary>Probability of each child number from the root.</summary>
    public double[] Probability { get; }

    /// <summary>E of each node.</summary>
    public double[] Entropy { get; }

    /// <summary>L of each node (without the dissimilarity in front).</summary>
    public ReadOnlySpan<double> LogSum => logSum;

    /// <summary>Dissimilarity of each node, as last set.</summary>
    public ReadOnlySpan<double> Dissimilarity => l;

    /// <summary>Inner node above each child number; -1 for the root.</summary>
    public int[] Parent { get; }

    /// <summary>Whether the child has anything offered.</summary>
    public bool IsOffered(int child) => any[child];

    /// <summary>Sets the dissimilarity of every node; the root's must be 1.</summary>
    public void SetDissimilarities(ReadOnlySpan<double> dissimilarity) => dissimilarity.CopyTo(l);

    /// <summary>Computes values and probabilities.</summary>
    /// <param name="utility">V of the J alternatives; ignored where not offered.</param>
    /// <param name="offered">Which alternatives are offered; at least one.</param>
    public void Compute(ReadOnlySpan<double> utility, ReadOnlySpan<bool> offered)
    {
        for (var j = 0; j < J; j++)
        {
            any[j] = offered[j];
            Value[j] = offered[j] ? utility[j] : 0;
            Conditional[j] = 0;
        }

        var scaled = Form == NestedLogitForm.UtilityScaled;
        for (var n = 0; n < tree.Nodes.Length; n++)
        {
            var scale = scaled ? l[n] : 1;
            var max = double.NegativeInfinity;
            foreach (var c in tree.Nodes[n].Children) if (any[c]) max = Math.Max(max, Value[c]);
            any[J + n] = !double.IsNegativeInfinity(max);
            Conditional[J + n] = 0;
            Entropy[n] = logSum[n] = Value[J + n] = 0;
            if (!any[J + n]) continue;

            var sum = 0.0;
            foreach (var c in tree.Nodes[n].Children) if (any[c]) sum += Math.Exp((Value[c] - max) / scale);
            var log = Math.Log(sum);
            logSum[n] = (max / scale) + log;
            Value[J + n] = scaled ? max + (l[n] * log) : l[n] * (max + log);
            foreach (var c in tree.Nodes[n].Children)
            {
                if (!any[c]) continue;
                var logP = ((Value[c] - max) / scale) - log;
                LogConditional[c] = logP;
                Conditional[c] = Math.Exp(logP);
                if (Conditional[c] > 0) Entropy[n] -= Conditional[c] * logP;
            }
        }

        Probability[J + tree.Root] = Conditional[J + tree.Root] = 1;
        for (var n = tree.Root; n >= 0; n--)
            foreach (var c in tree.Nodes[n].Children) Probability[c] = any[c] ? Probability[J + n] * Conditional[c] : 0;
    }

    /// <summary>log P of an offered alternative, summed along its path and never taken from a rounded probability.</summary>
    public double LogProbability(int alternative)
    {
        var log = 0.0;
        for (var c = alternative; Parent[c] >= 0; c = J + Parent[c]) log += LogConditional[c];
        return log;
    }

    /// <summary>
    /// First derivatives of log P(<paramref name="chosen"/>). The derivative by V of alternative j is the generalised residual g_j.
    /// </summary>
    /// <param name="chosen">An offered alternative.</param>
    /// <param name="byValue">Receives d log P / d W of every child number; the first J are d log P / d V.</param>
    /// <param name="byDissimilarity">Receives d log P / d l of every node.</param>
    public void Gradient(int chosen, Span<double> byValue, Span<double> byDissimilarity)
    {
        byValue[..(J + tree.Nodes.Length)].Clear();
        byDissimilarity[..tree.Nodes.Length].Clear();
        var scaled = Form == NestedLogitForm.UtilityScaled;
        for (var c = chosen; Parent[c] >= 0; c = J + Parent[c])
        {
            var n = Parent[c];
            if (scaled)
            {
                byValue[c] += 1 / l[n];
                byValue[J + n] -= 1 / l[n];
                byDissimilarity[n] -= LogConditional[c] / l[n];
            }
            else
            {
                byValue[c] += 1;
            }
        }

        var onPath = J + tree.Root;
        for (var n = tree.Root; n >= 0; n--)
        {
            if (!any[J + n]) continue;
            var isOnPath = onPath == J + n;
            double flow;
            if (scaled)
            {
                flow = byValue[J + n];
                byDissimilarity[n] += flow * Entropy[n];
            }
            else
            {
                flow = (byValue[J + n] * l[n]) - (isOnPath ? 1 : 0);
                byDissimilarity[n] += byValue[J + n] * logSum[n];
            }

            foreach (var c in tree.Nodes[n].Children)
            {
                if (!any[c]) continue;
                byValue[c] += flow * Conditional[c];
                if (isOnPath && IsOnPath(c, chosen)) onPath = c;
            }
        }
    }

    /// <summary>Whether a child number is the alternative itself or one of the nodes above it.</summary>
    public bool IsOnPath(int child, int alternative)
    {
        var c = alternative;
        while (c != child && Parent[c] >= 0) c = J + Parent[c];
        return c == child;
    }
}
