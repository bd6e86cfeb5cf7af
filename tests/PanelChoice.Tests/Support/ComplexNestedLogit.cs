using System.Numerics;
using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Tests.Support;

/// <summary>
/// The weighted log-likelihood in complex arithmetic, written from the definition of the model and from nothing else in the library but the
/// layout of its parameters. The imaginary part at a step of 1e-60 is the first derivative to full precision (Squire and Trapp 1998); second
/// derivatives are seven-point differences of those.
/// </summary>
internal sealed class ComplexNestedLogit(RandomTreeCase made, NestedLogitForm form)
{
    private const double Step = 1e-60;
    private static readonly double[] SevenPoint = [3.0 / 4, -3.0 / 20, 1.0 / 60];
    private readonly ChoiceDesign design = made.Design(form);

    public double[] Gradient(double[] point)
    {
        var gradient = new double[point.Length];
        for (var k = 0; k < point.Length; k++)
        {
            var at = point.Select(x => new Complex(x, 0)).ToArray();
            at[k] += new Complex(0, Step);
            gradient[k] = LogLikelihood(at).Imaginary / Step;
        }

        return gradient;
    }

    public double[] Hessian(double[] point)
    {
        const double h = 4e-3;
        var K = point.Length;
        var hessian = new double[K * K];
        for (var k = 0; k < K; k++)
            for (var i = 1; i <= 3; i++)
                foreach (var sign in (int[])[1, -1])
                {
                    var at = (double[])point.Clone();
                    at[k] += sign * i * h;
                    var gradient = Gradient(at);
                    for (var q = 0; q < K; q++) hessian[(k * K) + q] += sign * SevenPoint[i - 1] * gradient[q] / h;
                }

        return hessian;
    }

    public Complex LogLikelihood(Complex[] point)
    {
        var total = Complex.Zero;
        for (int person = 0, s = 0; person < made.OccasionsOf.Length; person++)
            for (var t = 0; t < made.OccasionsOf[person]; t++, s++)
                if (made.Weight[person] != 0) total += made.Weight[person] * LogProbability(point, s);
        return total;
    }

    private Complex LogProbability(Complex[] point, int s)
    {
        var tree = design.Tree;
        var J = tree.Alternatives.Length;
        var value = new Complex?[J + tree.Nodes.Length];
        for (var j = 0; j < J; j++)
        {
            if (!made.Offered[s][j]) continue;
            var v = Complex.Zero;
            for (var k = 0; k < made.Terms.Length; k++)
                if (made.Terms[k].Enters.Contains(j)) v += point[k] * made.Terms[k].Value[s][j];
            value[j] = v;
        }

        var log = Complex.Zero;
        var onPath = made.Chosen[s];
        for (var n = 0; n < tree.Nodes.Length; n++)
        {
            var offered = tree.Nodes[n].Children.Where(c => value[c] is not null).ToList();
            if (offered.Count == 0) continue;
            var l = design.Layout.NodeParameter[n] is >= 0 and var q ? point[q] : 1;
            var scale = form == NestedLogitForm.UtilityScaled ? l : 1;
            var largest = offered.MaxBy(c => (value[c]!.Value / scale).Real);
            var sum = offered.Aggregate(Complex.Zero, (a, c) => a + Complex.Exp((value[c]!.Value - value[largest]!.Value) / scale));
            var logSum = (value[largest]!.Value / scale) + Complex.Log(sum);
            value[J + n] = l * logSum;
            if (!tree.Nodes[n].Children.Contains(onPath)) continue;
            log += (value[onPath]!.Value / scale) - logSum;
            onPath = J + n;
        }

        return log;
    }
}
