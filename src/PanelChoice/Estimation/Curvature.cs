using System.Collections.Immutable;
using PanelChoice.Likelihood;
using PanelChoice.Optimisation;

namespace PanelChoice.Estimation;

/// <summary>What the curvature at a maximum says about how well the parameters can be told apart.</summary>
/// <param name="Condition">Largest over smallest eigenvalue of the information, scaled to unit diagonal; infinite when singular.</param>
/// <param name="Weakest">Parameters that make up the weakest direction.</param>
/// <param name="IsIdentified">False when log P of no choice changes along the weakest direction.</param>
/// <param name="GradientNorm">Largest absolute gradient, each times the parameter's pooled standard error.</param>
internal sealed record Curvature(double Condition, ImmutableArray<int> Weakest, bool IsIdentified, double GradientNorm)
{
    /// <summary>Smallest over largest eigenvalue below which the scores are asked whether the direction exists at all.</summary>
    private const double Suspect = 1e-8;

    /// <summary>Share of the scores' size left along a direction that no choice depends on: rounding, squared.</summary>
    private const double NoScore = 1e-14;

    /// <summary>Judges the curvature at a point.</summary>
    /// <param name="likelihood">The likelihood.</param>
    /// <param name="function">The function that was minimised.</param>
    /// <param name="at">Its derivatives at the point.</param>
    /// <param name="parameters">K parameters at the point.</param>
    /// <param name="personWeight">Weight of each person.</param>
    public static Curvature Of(
        IChoiceLikelihood likelihood, MinusLogLikelihood function, SmoothValue at, double[] parameters, double[] personWeight)
    {
        var active = function.Active;
        var n = active.Length;
        if (n == 0) return new Curvature(1, [], true, 0);
        // Attributes so large or dissimilarities so small that second derivatives overflow leave nothing to judge; the search says where it stopped.
        if (!Array.TrueForAll(at.Hessian, double.IsFinite)) return new Curvature(double.PositiveInfinity, [], true, double.NaN);
        var root = new double[n];
        for (var i = 0; i < n; i++) root[i] = at.Hessian[(i * n) + i] > 0 ? Math.Sqrt(at.Hessian[(i * n) + i]) : 1;
        var scaled = new double[n * n];
        for (var i = 0; i < n; i++)
            for (var j = 0; j < n; j++) scaled[(i * n) + j] = at.Hessian[(i * n) + j] / (root[i] * root[j]);
        var spectrum = Spectrum.Of(scaled);
        var smallest = spectrum.Values[0];
        var condition = smallest > 0 ? spectrum.Largest / smallest : double.PositiveInfinity;

        var weakest = spectrum.Vector(0).ToArray();
        var strongest = weakest.Max(Math.Abs);
        ImmutableArray<int> about = [.. Enumerable.Range(0, n).Where(i => Math.Abs(weakest[i]) > 0.1 * strongest).Select(i => active[i])];
        var identified = true;
        if (smallest <= Suspect * spectrum.Largest)
        {
            var direction = new double[n];
            for (var i = 0; i < n; i++) direction[i] = weakest[i] / root[i];
            identified = ScoreShare(likelihood, function, direction, parameters, personWeight) > NoScore;
        }

        return new Curvature(condition, about, identified, ScaledGradient(spectrum, at.Gradient, root));
    }

    /// <summary>Squared scores along a direction, as a share of what its parameters contribute one by one.</summary>
    private static double ScoreShare(
        IChoiceLikelihood likelihood, MinusLogLikelihood function, double[] direction, double[] parameters, double[] personWeight)
    {
        var design = likelihood.Design;
        var v = function.Direction(function.Coordinates(parameters), direction);
        var scores = Array.Empty<double>();
        double along = 0, apart = 0;
        foreach (var block in design.Blocks)
        {
            if (scores.Length < block.Situations * v.Length) scores = new double[block.Situations * v.Length];
            likelihood.Scores(parameters, block, scores);
            for (int s = 0, person = design.PersonOf[block.FirstSituation]; s < block.Situations; s++)
            {
                if (block.FirstSituation + s == design.PersonStart[person + 1]) person++;
                if (personWeight[person] == 0) continue;
                var sum = 0.0;
                for (var k = 0; k < v.Length; k++)
                {
                    var term = scores[(s * v.Length) + k] * v[k];
                    sum += term;
                    apart += term * term;
                }

                along += sum * sum;
            }
        }

        return apart > 0 ? along / apart : 0;
    }

    private static double ScaledGradient(Spectrum spectrum, double[] gradient, double[] root)
    {
        var n = gradient.Length;
        var largest = 0.0;
        for (var k = 0; k < n; k++)
        {
            var variance = 0.0;
            for (var i = 0; i < n; i++)
                if (spectrum.Values[i] > TrustRegionStep.Flat * spectrum.Largest) variance += spectrum.Vector(i)[k] * spectrum.Vector(i)[k] / spectrum.Values[i];
            largest = Math.Max(largest, Math.Abs(gradient[k]) / root[k] * Math.Sqrt(variance));
        }

        return largest;
    }
}
