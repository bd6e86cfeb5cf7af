using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>A case with what several rows share: the design, the likelihood on one thread, the fitted model.</summary>
internal sealed class CaseAtWork
{
    private readonly Lazy<FittedModel> model;

    public CaseAtWork(CommuteCase made)
    {
        Made = made;
        Design = made.Design();
        Likelihood = new VectorNestedLogit(Design, CommuteCase.Form, 1);
        PersonWeight = [.. Design.PersonWeight];
        model = new(ColdFit);
    }

    public CommuteCase Made { get; }

    /// <summary>Name of the case and how its columns are stored.</summary>
    public string Label => $"{Made.Shape.Name} {Made.Storage}";

    public ChoiceDesign Design { get; }

    public VectorNestedLogit Likelihood { get; }

    public double[] Theta => Made.Truth;

    public double[] PersonWeight { get; }

    /// <summary>The model fitted from one start.</summary>
    public FittedModel Model => model.Value;

    /// <summary>The likelihood with its gradient, in the way every row counts passes.</summary>
    public LikelihoodEvaluation GradientPass() => Likelihood.Evaluate(Theta, PersonWeight, Derivatives.Gradient);

    /// <summary>A fit that knows nothing beforehand, from one start.</summary>
    public FittedModel ColdFit() => ColdFit(Likelihood);

    /// <summary>The same fit by another likelihood of the design.</summary>
    public static FittedModel ColdFit(IChoiceLikelihood likelihood) => MaximumLikelihood.Fit(
        likelihood, CommuteCase.Form, new EstimateSettings(CommuteCase.Form, Starts: 1, Seed: 7), WorkContext.Quiet);
}
