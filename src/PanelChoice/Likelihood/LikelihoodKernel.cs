using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Likelihood;

/// <summary>Chooses the kernel.</summary>
public static class LikelihoodKernel
{
    /// <summary>Environment variable that forces a kernel: <c>scalar</c> or <c>vector</c>.</summary>
    public const string Variable = "PANELCHOICE_KERNEL";

    /// <summary>The nested logit likelihood of a design: the vector kernel, unless <see cref="Variable"/> asks for the scalar reference.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">Where the dissimilarity sits.</param>
    /// <param name="threads">Threads, 1 or more; no figure depends on it.</param>
    /// <exception cref="ArgumentException"><see cref="Variable"/> is set to something else.</exception>
    public static IChoiceLikelihood Create(ChoiceDesign design, NestedLogitForm form, int threads) =>
        Create(design, form, threads, Environment.GetEnvironmentVariable(Variable));

    /// <summary>Whether a value of <see cref="Variable"/> names a kernel, or leaves the choice open (null or empty).</summary>
    public static bool Knows(string? kernel) => kernel is null or "" or "vector" or "scalar";

    /// <summary>The likelihood by the given kernel; the vector kernel where the name is null or empty.</summary>
    internal static IChoiceLikelihood Create(ChoiceDesign design, NestedLogitForm form, int threads, string? kernel) => kernel switch
    {
        null or "" or "vector" => new VectorNestedLogit(design, form, threads),
        "scalar" => new ScalarNestedLogit(design, form, threads),
        _ => throw new ArgumentException($"The environment variable {Variable} is \"{kernel}\"; it may be \"scalar\" or \"vector\".", nameof(kernel)),
    };
}
