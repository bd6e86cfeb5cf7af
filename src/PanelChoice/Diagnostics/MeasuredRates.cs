using System.Collections.Immutable;
using System.Globalization;

namespace PanelChoice.Diagnostics;

/// <summary>
/// What simulation measured for panels of a few sizes: how often the cause rule is right, and how often the detector sees a dependence of
/// stated strength. Five alternatives, two nests, exact nested logit errors; nothing here depends on the user's data but the size.
/// Figures between the simulated sizes are not invented: the nearest size in logarithms of persons and occasions is quoted and named.
/// </summary>
internal static class MeasuredRates
{
    private static readonly ImmutableArray<(int Persons, int Occasions)> HitSizes = [(15, 20), (40, 5), (40, 20), (150, 5), (150, 20)];

    /// <summary>
    /// Percent of right answers by truth and size: 200 panels in each cell, run through the whole battery (person means in the static fit,
    /// verdict by Holm). DEVELOPERS.md gives the command.
    /// </summary>
    private static readonly ImmutableArray<(DependenceCause Cause, string Truth, double[] Right)> Hits =
    [
        (DependenceCause.Taste, "lasting taste of standard deviation 0.5", [58.5, 9.5, 88.5, 39.5, 90.5]),
        (DependenceCause.Taste, "lasting taste of standard deviation 1", [89.4, 60.5, 95.5, 92, 97]),
        (DependenceCause.Taste, "lasting taste for nests of standard deviation 1", [62.5, 16.5, 87.5, 42, 95]),
        (DependenceCause.Habit, "a last-choice effect of 0.8", [78, 46, 93.5, 90, 98]),
        (DependenceCause.HabitAndTaste, "a last-choice effect of 0.8 with lasting taste of standard deviation 0.5", [43, 9.5, 75, 53.5, 93.5]),
        (DependenceCause.HabitAndTaste, "a last-choice effect of 0.8 with lasting taste of standard deviation 1", [59.6, 24.1, 91.5, 61, 100]),
        (DependenceCause.SerialErrors, "errors autocorrelated by 0.3", [19.5, 2, 41.5, 20.5, 68]),
        (DependenceCause.SerialErrors, "errors autocorrelated by 0.6", [41.5, 22.5, 71.5, 52, 92]),
    ];

    private static readonly ImmutableArray<(int Persons, int Occasions)> PowerSizes =
        [(15, 5), (15, 20), (15, 60), (40, 5), (40, 20), (40, 60), (150, 5), (150, 20), (500, 5)];

    /// <summary>Below this share of the quoted size's occasions its rate would flatter the panel; rates hardly move within it.</summary>
    private const double MuchSmaller = 0.9;

    private static readonly int[] TasteStatic = [20, 89, 100, 38, 100, 100, 94, 100, 100];
    private static readonly int[] TasteDynamic = [19, 87, 100, 29, 100, 100, 79, 100, 100];
    private static readonly int[] ErrorsStatic = [26, 85, 100, 66, 100, 100, 99, 100, 100];
    private static readonly int[] ErrorsDynamic = [12, 28, 65, 16, 44, 93, 39, 91, 75];

    /// <summary>How often the rule is right when the truth is the given cause, at the weakest strength simulated; null when no cause was told.</summary>
    /// <param name="cause">The cause told.</param>
    /// <param name="persons">Persons of the panel.</param>
    /// <param name="occasions">Mean occasions of a person.</param>
    public static HitRate? HitRateOf(DependenceCause? cause, int persons, double occasions)
    {
        var rows = Hits.Where(h => h.Cause == cause).ToList();
        if (rows.Count == 0) return null;
        var size = Nearest(HitSizes, persons, occasions);
        var parts = rows.Select(r => string.Create(CultureInfo.InvariantCulture, $"{r.Right[size]} percent under {r.Truth}"));
        return new HitRate(
            rows.Min(r => r.Right[size]) / 100,
            string.Create(
                CultureInfo.InvariantCulture,
                $"200 panels for each truth, of {HitSizes[size].Persons} persons x {HitSizes[size].Occasions} occasions, the simulated size nearest to this panel{Shortfall(HitSizes[size], persons, occasions)}, a model without past choices, level 5 percent: the rule named this cause in {string.Join(", ", parts)}{(rows.Count > 1 ? "; the lowest is given" : "")}"));
    }

    /// <summary>How much power a panel of about this size has to see dependence, as one sentence.</summary>
    /// <param name="persons">Persons of the panel.</param>
    /// <param name="occasions">Mean occasions of a person.</param>
    /// <param name="hasPastChoice">Whether the model has a term for past choices, which hides part of the signal.</param>
    public static string Power(int persons, double occasions, bool hasPastChoice)
    {
        var size = Nearest(PowerSizes, persons, occasions);
        var taste = (hasPastChoice ? TasteDynamic : TasteStatic)[size];
        var errors = (hasPastChoice ? ErrorsDynamic : ErrorsStatic)[size];
        return string.Create(
            CultureInfo.InvariantCulture,
            $"Power: in simulated panels of {PowerSizes[size].Persons} persons x {PowerSizes[size].Occasions} occasions (the simulated size nearest to this panel, model {(hasPastChoice ? "with" : "without")} the last choice, level 5 percent) the detector saw lasting taste of standard deviation 0.5 in {taste} percent and errors autocorrelated by 0.3 in {errors} percent{Shortfall(PowerSizes[size], persons, occasions)}; no sign of dependence is not proof of independence.");
    }

    /// <summary>What must be said where the panel has fewer occasions in all than the quoted size: its own rate is lower.</summary>
    private static string Shortfall((int Persons, int Occasions) size, int persons, double occasions) =>
        persons * occasions < MuchSmaller * size.Persons * size.Occasions ? " (this one is smaller, so expect less)" : "";

    private static int Nearest(ImmutableArray<(int Persons, int Occasions)> sizes, int persons, double occasions)
    {
        double Distance((int Persons, int Occasions) size) =>
            Math.Pow(Math.Log(size.Persons / (double)persons), 2) + Math.Pow(Math.Log(size.Occasions / occasions), 2);
        return Enumerable.Range(0, sizes.Length).MinBy(i => Distance(sizes[i]));
    }
}
