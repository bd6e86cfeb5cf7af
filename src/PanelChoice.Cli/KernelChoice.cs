using PanelChoice.Likelihood;

namespace PanelChoice.Cli;

/// <summary>The kernel that the environment asks for.</summary>
internal static class KernelChoice
{
    /// <summary>Whether it can be had; tells the problem when it cannot.</summary>
    /// <param name="options">Where to tell it.</param>
    public static bool IsToBeHad(RunOptions options)
    {
        var kernel = Environment.GetEnvironmentVariable(LikelihoodKernel.Variable);
        if (LikelihoodKernel.Refusal(kernel) is not { } refusal) return true;
        options.Terminal.Problem($"the environment variable {LikelihoodKernel.Variable} is '{kernel}', {refusal}.");
        return false;
    }
}
