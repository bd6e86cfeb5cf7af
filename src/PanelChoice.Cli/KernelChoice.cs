using PanelChoice.Likelihood;

namespace PanelChoice.Cli;

/// <summary>The kernel that the environment asks for.</summary>
internal static class KernelChoice
{
    /// <summary>Whether it is one that exists; tells the problem when it is not.</summary>
    /// <param name="options">Where to tell it.</param>
    public static bool IsKnown(RunOptions options)
    {
        var kernel = Environment.GetEnvironmentVariable(LikelihoodKernel.Variable);
        if (LikelihoodKernel.Knows(kernel)) return true;
        options.Terminal.Problem($"the environment variable {LikelihoodKernel.Variable} is '{kernel}'; set it to scalar or vector, or unset it.");
        return false;
    }
}
