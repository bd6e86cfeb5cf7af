using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Study;

namespace PanelChoice.Estimation;

/// <summary>
/// Coefficients that alone separate the choices: every chosen alternative has at least as much (or at most as little) of the column as each other
/// that was offered. Then no choice becomes less likely as the coefficient moves that way, and the maximum is not finite (Albert and Anderson 1984).
/// A never-chosen alternative with a constant of its own is the commonest case.
/// </summary>
internal static class Separation
{
    /// <summary>The active coefficients that separate alone.</summary>
    /// <param name="design">The design.</param>
    /// <param name="form">Its form.</param>
    /// <param name="evidence">Evidence on each parameter among the persons with positive weight.</param>
    /// <param name="active">Parameters to estimate.</param>
    /// <param name="personWeight">Weight of each person.</param>
    public static ImmutableArray<int> OneSided(
        ChoiceDesign design, NestedLogitForm form, Evidence[] evidence, ImmutableArray<int> active, double[] personWeight) =>
        [.. active.Where(k => k < design.Layout.Coefficients && IsOneSided(evidence[k]) && HoldsForAnyDissimilarity(design, form, k, evidence[k], personWeight))];

    private static bool IsOneSided(Evidence e) => e.HasFlag(Evidence.Varies) && e.HasFlag(Evidence.ChosenHasMore) != e.HasFlag(Evidence.ChosenHasLess);

    /// <summary>
    /// In the utility-scaled form separation does not depend on the dissimilarities. In the unscaled form a shift common to several nests is not
    /// neutral, so the direction must hold at equal and at unequal dissimilarities.
    /// </summary>
    private static bool HoldsForAnyDissimilarity(ChoiceDesign design, NestedLogitForm form, int k, Evidence evidence, double[] personWeight)
    {
        if (form == NestedLogitForm.UtilityScaled || design.Layout.Nests.IsEmpty) return true;
        var layout = design.Layout;
        var v = new double[layout.Count];
        v[k] = evidence.HasFlag(Evidence.ChosenHasMore) ? 1 : -1;
        foreach (var (first, next) in new[] { (1.0, 1.0), (0.9, 0.3), (0.3, 0.9) })
        {
            var at = new double[layout.Count];
            for (var q = layout.Coefficients; q < at.Length; q++) at[q] = layout.Parameters[q].Fixed ?? (q % 2 == 0 ? first : next);
            if (!LinearIndex.NeverGoesAgainstChoices(design, form, at, v, personWeight, 1e-10)) return false;
        }

        return true;
    }
}
