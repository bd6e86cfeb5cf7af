using System.Collections.Concurrent;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Likelihood;

/// <summary>
/// The residuals of a design at given parameters, by the kernel that the process runs. Work is cut into the fixed chunks of blocks of the
/// likelihood, each of which holds whole persons; work spaces are lent to whoever has a chunk.
/// </summary>
internal sealed class ResidualKernel
{
    private readonly NestedLogitForm form;
    private readonly double[] parameters;
    private readonly StripPlan? plan;
    private readonly ConcurrentBag<SituationResiduals> idle = [];

    private ResidualKernel(ChoiceDesign design, NestedLogitForm form, ReadOnlySpan<double> parameters, bool isScalar)
    {
        Layout = new ResidualLayout(design);
        this.form = form;
        this.parameters = parameters.ToArray();
        plan = isScalar ? null : new StripPlan(design, form);
    }

    /// <summary>The space of the residuals.</summary>
    public ResidualLayout Layout { get; }

    /// <summary>The kernel of this process: the vector kernel, unless <see cref="LikelihoodKernel.Variable"/> asks for the scalar reference.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">The form.</param>
    /// <param name="parameters">All parameters, free and fixed.</param>
    public static ResidualKernel Create(ChoiceDesign design, NestedLogitForm form, ReadOnlySpan<double> parameters) =>
        Create(design, form, parameters, Environment.GetEnvironmentVariable(LikelihoodKernel.Variable));

    /// <summary>The given kernel; the vector kernel where the name is null or empty.</summary>
    internal static ResidualKernel Create(ChoiceDesign design, NestedLogitForm form, ReadOnlySpan<double> parameters, string? kernel) =>
        LikelihoodKernel.Refusal(kernel) is { } refusal
            ? throw new ArgumentException($"The environment variable {LikelihoodKernel.Variable} is '{kernel}', {refusal}.", nameof(kernel))
            : new ResidualKernel(design, form, parameters, kernel == "scalar");

    /// <summary>Runs the action for every chunk of the design's blocks.</summary>
    /// <param name="threads">Threads, 1 or more; the chunks do not depend on it.</param>
    /// <param name="action">Called with a work space, chunk index, first block and the block after the last.</param>
    public void ForEachChunk(int threads, Action<SituationResiduals, int, int, int> action) =>
        FixedChunks.Run(Layout.Design.Blocks.Length, threads, (chunk, first, end) => Lend(residuals => action(residuals, chunk, first, end)));

    /// <summary>Lends a work space.</summary>
    public void Lend(Action<SituationResiduals> action)
    {
        if (!idle.TryTake(out var residuals)) residuals = plan is null ? new ScalarResiduals(Layout, form, parameters) : new VectorResiduals(Layout, plan, parameters);
        action(residuals);
        idle.Add(residuals);
    }
}
