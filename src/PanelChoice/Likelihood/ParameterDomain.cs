using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>Where the nested logit likelihood is defined: finite parameters, positive dissimilarities. Elsewhere every figure is NaN.</summary>
internal static class ParameterDomain
{
    /// <summary>Whether the parameters lie in it.</summary>
    /// <exception cref="ArgumentException">Not as many parameters as the layout has.</exception>
    public static bool Contains(ParameterLayout layout, ReadOnlySpan<double> parameters)
    {
        if (parameters.Length != layout.Count)
            throw new ArgumentException($"{layout.Count} parameters are needed, {parameters.Length} were given.", nameof(parameters));
        for (var k = 0; k < parameters.Length; k++)
            if (!double.IsFinite(parameters[k]) || (k >= layout.Coefficients && parameters[k] <= 0)) return false;
        return true;
    }

    /// <summary>The evaluation outside it.</summary>
    public static LikelihoodEvaluation Undefined(int parameters, Derivatives derivatives) => new(
        double.NaN,
        derivatives >= Derivatives.Gradient ? [.. Nan(parameters)] : [],
        derivatives == Derivatives.Hessian ? [.. Nan(parameters * parameters)] : []);

    /// <summary>The sums of scores outside it.</summary>
    public static SampleScores NoScores(ChoiceDesign design) =>
        new(Nan(design.Persons * design.Layout.Count), Nan(design.Layout.Count * design.Layout.Count));

    /// <summary>That many NaN.</summary>
    public static double[] Nan(int count)
    {
        var all = new double[count];
        Array.Fill(all, double.NaN);
        return all;
    }
}
