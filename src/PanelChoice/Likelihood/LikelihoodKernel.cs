using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Likelihood;

/// <summary>Chooses the kernel.</summary>
public static class LikelihoodKernel
{
    /// <summary>The nested logit likelihood of a design.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">Where the dissimilarity sits.</param>
    /// <param name="threads">Threads, 1 or more; no figure depends on it.</param>
    public static IChoiceLikelihood Create(ChoiceDesign design, NestedLogitForm form, int threads) => new ScalarNestedLogit(design, form, threads);
}
