using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Likelihood;

/// <summary>Chooses the kernel.</summary>
public static class LikelihoodKernel
{
    /// <summary>Environment variable that forces a kernel: <c>scalar</c>, <c>vector</c>, or the vector kernel of one width, <c>vector512</c> or <c>vector256</c>.</summary>
    public const string Variable = "PANELCHOICE_KERNEL";

    /// <summary>The nested logit likelihood of a design: the vector kernel, unless <see cref="Variable"/> asks for the scalar reference.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">Where the dissimilarity sits.</param>
    /// <param name="threads">Threads, 1 or more; no figure depends on it.</param>
    /// <exception cref="ArgumentException"><see cref="Variable"/> asks for a kernel that does not exist or does not run here.</exception>
    public static IChoiceLikelihood Create(ChoiceDesign design, NestedLogitForm form, int threads) =>
        Create(design, form, threads, Environment.GetEnvironmentVariable(Variable));

    /// <summary>Name of the kernel that this process uses, as <see cref="IChoiceLikelihood.Kernel"/> gives it.</summary>
    internal static string NameHere =>
        Environment.GetEnvironmentVariable(Variable) == ScalarNestedLogit.Name ? ScalarNestedLogit.Name : VectorNestedLogit.Name;

    /// <summary>Why a value of <see cref="Variable"/> cannot be had, and what to do, as the rest of a sentence; null where it can, or leaves the choice open.</summary>
    /// <param name="kernel">The value; null or empty leaves the choice open.</param>
    public static string? Refusal(string? kernel) => Refusal(kernel, VectorNestedLogit.Name);

    /// <summary><see cref="Refusal(string?)"/> in a process whose vector kernel has the given name. The runtime settles the width before a program starts.</summary>
    internal static string? Refusal(string? kernel, string here) => kernel switch
    {
        null or "" or "vector" or "scalar" => null,
        _ when kernel == here => null,
        "vector256" when here == "vector512" => "but this process has 512-bit vectors; set DOTNET_EnableAVX512=0 as well, or use vector",
        "vector512" or "vector256" => $"but this process has {here}; use vector, or a machine with such vectors",
        _ => "which is no kernel; set it to scalar, vector, vector512 or vector256, or unset it",
    };

    /// <summary>The likelihood by the given kernel; the vector kernel where the name is null or empty.</summary>
    internal static IChoiceLikelihood Create(ChoiceDesign design, NestedLogitForm form, int threads, string? kernel)
    {
        if (Refusal(kernel) is { } refusal) throw new ArgumentException($"The environment variable {Variable} is '{kernel}', {refusal}.", nameof(kernel));
        return kernel == ScalarNestedLogit.Name ? new ScalarNestedLogit(design, form, threads) : new VectorNestedLogit(design, form, threads);
    }
}
