using System.Runtime.InteropServices;
using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Likelihood;

/// <summary>
/// The plain reference likelihood: one situation at a time, dense vectors, one accumulator per fixed chunk of persons. It is written to be
/// read; <c>estimate</c> runs the vector kernel, and both go through one test table.
/// <para>
/// Hessian: with y_c the derivative of W_c by all parameters (the covariates x_j of a leaf), z_m = sum_c p_c y_c, a_m = d log P / d W_m and,
/// in the utility-scaled form, y_m = z_m + E_m e_m, the second derivative of log P is
/// <code>
/// sum over nodes m:  a_m / l_m (sum_c p_c y_c y_c' - z_m z_m') - a_m / l_m^2 (u_m e_m' + e_m u_m') + a_m v_m / l_m^3 e_m e_m'
///   with u_m = sum_c p_c (W_c - Wbar_m) y_c, v_m = variance of W_c under p;
/// sum over the path: -(1/l_m^2) (d e_m' + e_m d') + 2 log p_c / l_m^2 e_m e_m',  d = y_c - y_m
/// </code>
/// and in the unscaled form, with b_m = a_m l_m - [m on the path] and y_m = l_m z_m + L_m e_m,
/// <code>
/// sum over nodes m:  b_m (sum_c p_c y_c y_c' - z_m z_m') + a_m (e_m z_m' + z_m e_m')
/// </code>
/// e_m is the unit vector of l_m. Derived for this project; checked against differences on random trees.
/// </para>
/// </summary>
internal sealed class ScalarNestedLogit : IChoiceLikelihood
{
    /// <summary>Name of this kernel.</summary>
    internal const string Name = "scalar";

    private readonly NestedLogitForm form;
    private readonly int threads;

    /// <summary>The reference likelihood of a design.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">The form.</param>
    /// <param name="threads">Threads, 1 or more; the result does not depend on it.</param>
    public ScalarNestedLogit(ChoiceDesign design, NestedLogitForm form, int threads)
    {
        Design = design;
        this.form = form;
        this.threads = threads;
    }

    public ChoiceDesign Design { get; }

    public string Kernel => Name;

    private int K => Design.Layout.Count;

    public LikelihoodEvaluation Evaluate(ReadOnlySpan<double> parameters, ReadOnlySpan<double> personWeight, Derivatives derivatives)
    {
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.Undefined(K, derivatives);
        var theta = parameters.ToArray();
        var weight = personWeight.ToArray();
        var chunks = Numerics.FixedChunks.Count(Design.Persons);
        var parts = new (double Value, double[] Gradient, double[] Hessian)[chunks];
        Numerics.FixedChunks.Run(Design.Persons, threads, (chunk, first, end) =>
        {
            var work = new Situation(Design, form, theta);
            var value = 0.0;
            var gradient = derivatives == Derivatives.None ? [] : new double[K];
            var hessian = derivatives == Derivatives.Hessian ? new double[K * K] : [];
            for (var person = first; person < end; person++)
            {
                if (weight[person] == 0) continue;
                for (var s = Design.PersonStart[person]; s < Design.PersonStart[person + 1]; s++)
                {
                    work.Load(s);
                    value += weight[person] * work.LogProbability();
                    if (derivatives >= Derivatives.Gradient) work.AddGradient(weight[person], gradient);
                    if (derivatives == Derivatives.Hessian) work.AddHessian(weight[person], hessian);
                }
            }

            parts[chunk] = (value, gradient, hessian);
        });

        var total = 0.0;
        var g = derivatives == Derivatives.None ? [] : new double[K];
        var h = derivatives == Derivatives.Hessian ? new double[K * K] : [];
        foreach (var part in parts)
        {
            total += part.Value;
            for (var k = 0; k < g.Length; k++) g[k] += part.Gradient[k];
            for (var k = 0; k < h.Length; k++) h[k] += part.Hessian[k];
        }

        return new LikelihoodEvaluation(total, ImmutableCollectionsMarshal.AsImmutableArray(g), ImmutableCollectionsMarshal.AsImmutableArray(h));
    }

    public double[] Scores(ReadOnlySpan<double> parameters)
    {
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.Nan(Design.Situations * K);
        var theta = parameters.ToArray();
        var scores = new double[Design.Situations * K];
        Numerics.FixedChunks.Run(Design.Situations, threads, (_, first, end) =>
        {
            var work = new Situation(Design, form, theta);
            for (var s = first; s < end; s++)
            {
                work.Load(s);
                work.AddGradient(1, scores.AsSpan(s * K, K));
            }
        });
        return scores;
    }

    public void Scores(ReadOnlySpan<double> parameters, DesignBlock block, Span<double> scores)
    {
        var own = scores[..(block.Situations * K)];
        own.Fill(double.NaN);
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return;
        own.Clear();
        var work = new Situation(Design, form, parameters.ToArray());
        for (var s = 0; s < block.Situations; s++)
        {
            work.Load(block.FirstSituation + s);
            work.AddGradient(1, own.Slice(s * K, K));
        }
    }

    public SampleScores SumScores(ReadOnlySpan<double> parameters, ReadOnlySpan<double> personWeight)
    {
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.NoScores(Design);
        var work = new Situation(Design, form, parameters.ToArray());
        var byPerson = new double[Design.Persons * K];
        var products = new double[K * K];
        var score = new double[K];
        for (var person = 0; person < Design.Persons; person++)
        {
            if (personWeight[person] == 0) continue;
            for (var s = Design.PersonStart[person]; s < Design.PersonStart[person + 1]; s++)
            {
                Array.Clear(score);
                work.Load(s);
                work.AddGradient(personWeight[person], score);
                for (var k = 0; k < K; k++)
                {
                    byPerson[(person * K) + k] += score[k];
                    for (var q = 0; q < K; q++) products[(k * K) + q] += score[k] * score[q];
                }
            }
        }

        return new SampleScores(byPerson, products);
    }

    public double[] LogProbabilities(ReadOnlySpan<double> parameters)
    {
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.Nan(Design.Situations);
        var work = new Situation(Design, form, parameters.ToArray());
        var log = new double[Design.Situations];
        for (var s = 0; s < log.Length; s++)
        {
            work.Load(s);
            log[s] = work.LogProbability();
        }

        return log;
    }

    public double[] PersonInformation(ReadOnlySpan<double> parameters) => PersonInformation(parameters, 0, Design.Persons);

    public double[] PersonInformation(ReadOnlySpan<double> parameters, int firstPerson, int endPerson)
    {
        var persons = endPerson - firstPerson;
        if (!ParameterDomain.Contains(Design.Layout, parameters)) return ParameterDomain.Nan(persons * K * K);
        var theta = parameters.ToArray();
        var information = new double[persons * K * K];
        Numerics.FixedChunks.Run(persons, threads, (_, first, end) =>
        {
            var work = new Situation(Design, form, theta);
            for (var person = first; person < end; person++)
                for (var s = Design.PersonStart[firstPerson + person]; s < Design.PersonStart[firstPerson + person + 1]; s++)
                {
                    work.Load(s);
                    work.AddHessian(-1, information.AsSpan(person * K * K, K * K));
                }
        });
        return information;
    }

    /// <summary>The work space of one situation.</summary>
    private sealed class Situation
    {
        private readonly ChoiceDesign design;
        private readonly double[] theta;
        private readonly TreeProbabilities tree;
        private readonly int J;
        private readonly int K;
        private readonly double[] utility;
        private readonly bool[] offered;
        private readonly double[] byValue;
        private readonly double[] byDissimilarity;
        private readonly double[][] y;
        private readonly double[] z;
        private readonly double[] u;
        private readonly double[] d;
        private readonly BlockReader reader;
        private int chosen;

        public Situation(ChoiceDesign design, NestedLogitForm form, double[] theta)
        {
            this.design = design;
            reader = design.Store.Reader();
            this.theta = theta;
            tree = new TreeProbabilities(design.Tree, form);
            J = design.Alternatives;
            K = design.Layout.Count;
            var nodes = design.Tree.Nodes.Length;
            var l = new double[nodes];
            for (var n = 0; n < nodes; n++) l[n] = design.Layout.NodeParameter[n] is var p && p >= 0 ? theta[p] : 1;
            tree.SetDissimilarities(l);
            utility = new double[J];
            offered = new bool[J];
            byValue = new double[J + nodes];
            byDissimilarity = new double[nodes];
            y = [.. Enumerable.Range(0, J + nodes).Select(_ => new double[K])];
            z = new double[K];
            u = new double[K];
            d = new double[K];
        }

        public void Load(int situation)
        {
            var block = design.Blocks[design.BlockOf[situation]];
            reader.Open(block);
            var lane = situation - block.FirstSituation;
            for (var j = 0; j < J; j++)
            {
                offered[j] = reader.IsOffered(lane, j);
                utility[j] = 0;
                Array.Clear(y[j]);
            }

            foreach (var column in design.Columns)
            {
                if (!offered[column.Alternative]) continue;
                var x = reader.Value(column.Storage, lane);
                y[column.Alternative][column.Parameter] = x;
                utility[column.Alternative] += theta[column.Parameter] * x;
            }

            chosen = reader.ChosenAt(lane);
            tree.Compute(utility, offered);
        }

        public double LogProbability() => tree.LogProbability(chosen);

        public void AddGradient(double weight, Span<double> gradient)
        {
            tree.Gradient(chosen, byValue, byDissimilarity);
            for (var j = 0; j < J; j++)
                if (offered[j])
                    for (var k = 0; k < K; k++) gradient[k] += weight * byValue[j] * y[j][k];
            for (var n = 0; n < design.Tree.Root; n++) gradient[design.Layout.NodeParameter[n]] += weight * byDissimilarity[n];
        }

        public void AddHessian(double weight, Span<double> hessian)
        {
            tree.Gradient(chosen, byValue, byDissimilarity);
            var scaled = tree.Form == NestedLogitForm.UtilityScaled;
            for (var n = 0; n < design.Tree.Nodes.Length; n++)
            {
                var node = J + n;
                if (!tree.IsOffered(node)) continue;
                var l = tree.Dissimilarity[n];
                var parameter = design.Layout.NodeParameter[n];
                var a = byValue[node];
                var children = design.Tree.Nodes[n].Children;
                var isOnPath = tree.IsOnPath(node, chosen);
                var b = scaled ? a / l : (a * l) - (isOnPath ? 1 : 0);

                Array.Clear(z);
                var mean = 0.0;
                foreach (var c in children)
                {
                    if (!tree.IsOffered(c)) continue;
                    Add(tree.Conditional[c], y[c], z);
                    mean += tree.Conditional[c] * tree.Value[c];
                    AddOuter(weight * b * tree.Conditional[c], y[c], y[c], hessian);
                }

                AddOuter(-weight * b, z, z, hessian);
                z.CopyTo(y[node], 0);
                if (scaled)
                {
                    if (parameter >= 0)
                    {
                        y[node][parameter] += tree.Entropy[n];
                        Array.Clear(u);
                        var variance = 0.0;
                        foreach (var c in children)
                        {
                            if (!tree.IsOffered(c)) continue;
                            var from = tree.Value[c] - mean;
                            Add(tree.Conditional[c] * from, y[c], u);
                            variance += tree.Conditional[c] * from * from;
                        }

                        AddCross(-weight * a / (l * l), u, parameter, hessian);
                        hessian[(parameter * K) + parameter] += weight * a * variance / (l * l * l);
                    }
                }
                else if (parameter >= 0)
                {
                    for (var k = 0; k < K; k++) y[node][k] *= l;
                    y[node][parameter] += tree.LogSum[n];
                    AddCross(weight * a, z, parameter, hessian);
                }
            }

            if (!scaled) return;
            for (var c = chosen; tree.Parent[c] >= 0; c = J + tree.Parent[c])
            {
                var n = tree.Parent[c];
                var parameter = design.Layout.NodeParameter[n];
                if (parameter < 0) continue;
                var l = tree.Dissimilarity[n];
                for (var k = 0; k < K; k++) d[k] = y[c][k] - y[J + n][k];
                AddCross(-weight / (l * l), d, parameter, hessian);
                hessian[(parameter * K) + parameter] += weight * 2 * tree.LogConditional[c] / (l * l);
            }
        }

        private static void Add(double factor, double[] from, double[] to)
        {
            for (var k = 0; k < to.Length; k++) to[k] += factor * from[k];
        }

        private void AddOuter(double factor, double[] left, double[] right, Span<double> hessian)
        {
            for (var r = 0; r < K; r++)
            {
                var f = factor * left[r];
                if (f == 0) continue;
                for (var c = 0; c < K; c++) hessian[(r * K) + c] += f * right[c];
            }
        }

        private void AddCross(double factor, double[] vector, int parameter, Span<double> hessian)
        {
            for (var k = 0; k < K; k++)
            {
                hessian[(k * K) + parameter] += factor * vector[k];
                hessian[(parameter * K) + k] += factor * vector[k];
            }
        }
    }
}
