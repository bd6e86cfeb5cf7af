using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Optimisation;

namespace PanelChoice.Estimation;

/// <summary>
/// Minus the log-likelihood, the only place that turns its sign, as a function of the coordinates the optimiser works in: a coefficient
/// times the scale of its column, and log(exp(l) - 1) for a dissimilarity l. That is log l for small l, where the likelihood answers to
/// ratios, and l itself for large l, where constants follow l in proportion and a logarithm would bend their common path. The value is divided by the
/// mean weight of a situation, so that the Newton decrement means standard errors whatever the unit of the weights.
/// </summary>
internal sealed class MinusLogLikelihood
{
    private readonly IChoiceLikelihood likelihood;
    private readonly double[] personWeight;
    private readonly double[] scale;
    private readonly double[] all;
    private (SmoothValue? Value, LikelihoodEvaluation? At) last;
    private (SmoothValue? Value, LikelihoodEvaluation? At) beforeLast;

    /// <summary>The function over some of the parameters; the others are held.</summary>
    /// <param name="likelihood">The likelihood.</param>
    /// <param name="personWeight">Weight of each person.</param>
    /// <param name="scale">Scale of each of the K parameters' columns; not used for dissimilarities.</param>
    /// <param name="active">Parameters that move, ascending.</param>
    /// <param name="parameters">K parameters; those not in <paramref name="active"/> stay as they are here.</param>
    public MinusLogLikelihood(
        IChoiceLikelihood likelihood, double[] personWeight, double[] scale, ImmutableArray<int> active, ReadOnlySpan<double> parameters)
    {
        this.likelihood = likelihood;
        this.personWeight = personWeight;
        this.scale = scale;
        Active = active;
        all = parameters.ToArray();
        (Unit, Situations) = MeanAndCount(likelihood.Design, personWeight);
    }

    /// <summary>Parameters that move.</summary>
    public ImmutableArray<int> Active { get; }

    /// <summary>Situations with a weight above 0.</summary>
    public long Situations { get; }

    /// <summary>Mean weight of these situations: what the log-likelihood is divided by.</summary>
    public double Unit { get; }

    /// <summary>Mean weight of a situation, among those with a weight above 0.</summary>
    public static double MeanWeight(ChoiceDesign design, double[] personWeight) => MeanAndCount(design, personWeight).Mean;

    private static (double Mean, long Count) MeanAndCount(ChoiceDesign design, double[] personWeight)
    {
        double sum = 0;
        long situations = 0;
        for (var p = 0; p < personWeight.Length; p++)
        {
            if (personWeight[p] == 0) continue;
            var own = design.PersonStart[p + 1] - design.PersonStart[p];
            sum += personWeight[p] * own;
            situations += own;
        }

        return (sum > 0 ? sum / situations : 1, situations);
    }

    /// <summary>The coordinates of a point.</summary>
    public double[] Coordinates(ReadOnlySpan<double> parameters)
    {
        var x = new double[Active.Length];
        for (var i = 0; i < x.Length; i++)
        {
            var k = Active[i];
            x[i] = IsDissimilarity(k) ? Coordinate(parameters[k]) : parameters[k] * scale[k];
        }

        return x;
    }

    /// <summary>All K parameters at a point.</summary>
    public double[] Parameters(ReadOnlySpan<double> x)
    {
        var parameters = (double[])all.Clone();
        for (var i = 0; i < x.Length; i++)
        {
            var k = Active[i];
            parameters[k] = IsDissimilarity(k) ? Dissimilarity(x[i]) : x[i] / scale[k];
        }

        return parameters;
    }

    /// <summary>A direction in coordinates as a direction of the K parameters.</summary>
    /// <param name="x">The point.</param>
    /// <param name="step">The direction there, in coordinates.</param>
    public double[] Direction(ReadOnlySpan<double> x, ReadOnlySpan<double> step)
    {
        var parameters = Parameters(x);
        var direction = new double[all.Length];
        for (var i = 0; i < step.Length; i++) direction[Active[i]] = step[i] * Slope(i, parameters);
        return direction;
    }

    /// <summary>The coordinate of a dissimilarity: log(exp(l) - 1), written so that neither end overflows.</summary>
    public static double Coordinate(double l) => l > 30 ? l + Log1p(-Math.Exp(-l)) : Math.Log(Expm1(l));

    /// <summary>The dissimilarity at a coordinate: log(1 + exp(x)).</summary>
    public static double Dissimilarity(double x) => x > 30 ? x + Log1p(Math.Exp(-x)) : Log1p(Math.Exp(x));

    /// <summary>The log-likelihood that belongs to a value of this function.</summary>
    public double LogLikelihood(double value) => -value * Unit;

    /// <summary>The function with its derivatives by the coordinates.</summary>
    public SmoothValue Evaluate(ReadOnlySpan<double> x)
    {
        var parameters = Parameters(x);
        var at = likelihood.Evaluate(parameters, personWeight, Derivatives.Hessian);
        var value = InCoordinates(parameters, at);
        (beforeLast, last) = (last, (value, at));
        return value;
    }

    /// <summary>The log-likelihood behind one of the last two values this function gave; null for any other.</summary>
    public LikelihoodEvaluation? Behind(SmoothValue value) =>
        ReferenceEquals(last.Value, value) ? last.At : ReferenceEquals(beforeLast.Value, value) ? beforeLast.At : null;

    /// <summary>What the likelihood is at a point, with its derivatives by the coordinates.</summary>
    /// <param name="parameters">All K parameters.</param>
    /// <param name="at">The log-likelihood there, with its Hessian.</param>
    public SmoothValue InCoordinates(ReadOnlySpan<double> parameters, LikelihoodEvaluation at)
    {
        var n = Active.Length;
        var K = all.Length;
        var gradient = new double[n];
        var hessian = new double[n * n];
        for (var i = 0; i < n; i++)
        {
            var di = Slope(i, parameters);
            gradient[i] = -at.Gradient[Active[i]] * di / Unit;
            for (var j = 0; j < n; j++)
                hessian[(i * n) + j] = -at.Hessian[(Active[i] * K) + Active[j]] * di * Slope(j, parameters) / Unit;
            // The second derivative of l by its coordinate is s (1 - s), s its slope.
            if (IsDissimilarity(Active[i])) hessian[(i * n) + i] += gradient[i] * (1 - di);
        }

        return new SmoothValue(-at.Value / Unit, gradient, hessian);
    }

    /// <summary>The gradient by the coordinates at a point where the likelihood is known with its first derivatives.</summary>
    /// <param name="parameters">All K parameters.</param>
    /// <param name="at">The log-likelihood there, with its gradient.</param>
    public double[] GradientInCoordinates(ReadOnlySpan<double> parameters, LikelihoodEvaluation at)
    {
        var gradient = new double[Active.Length];
        for (var i = 0; i < gradient.Length; i++) gradient[i] = -at.Gradient[Active[i]] * Slope(i, parameters) / Unit;
        return gradient;
    }

    /// <summary>Derivative of a parameter by its coordinate.</summary>
    private double Slope(int i, ReadOnlySpan<double> parameters) => IsDissimilarity(Active[i]) ? -Expm1(-parameters[Active[i]]) : 1 / scale[Active[i]];

    /// <summary>exp(x) - 1 and log(1 + x) to full accuracy near 0 by Kahan's division (Higham 2002, "Accuracy and Stability", 1.14.1).</summary>
    private static double Expm1(double x)
    {
        var u = Math.Exp(x);
        return u == 1 ? x : u - 1 == -1 ? -1 : (u - 1) * x / Math.Log(u);
    }

    private static double Log1p(double x)
    {
        var u = 1 + x;
        return u == 1 ? x : Math.Log(u) * x / (u - 1);
    }

    /// <summary>Whether one of the K parameters is a dissimilarity.</summary>
    public bool IsDissimilarity(int k) => k >= likelihood.Design.Layout.Coefficients;
}
