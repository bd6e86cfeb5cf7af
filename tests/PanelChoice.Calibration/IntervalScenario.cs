using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;

namespace PanelChoice.Calibration;

/// <summary>
/// How the people of a scenario behave, and what the pooled model estimates in panels without end: the values that intervals should cover. A fifth of
/// the persons hold a pass, and each choice depends on the last one (coefficient 0.8).
/// </summary>
internal sealed class IntervalScenario
{
    /// <summary>Occasions of each person.</summary>
    public const int Occasions = 20;

    private readonly CommuteProcess process;
    private readonly Lazy<double[]> limit;

    private IntervalScenario(char letter, string words, CommuteProcess process, (int Persons, int Occasions) large)
    {
        Letter = letter;
        Words = words;
        this.process = process;
        limit = new Lazy<double[]>(() => [.. Fit(SimulatedCommutes.Make(large.Persons, large.Occasions, process, true, 0, 0)).Parameters]);
    }

    /// <summary>Its letter.</summary>
    public char Letter { get; }

    /// <summary>What it is, in words.</summary>
    public string Words { get; }

    /// <summary>All parameters' values in panels without end, from one very large panel.</summary>
    public double[] Limit => limit.Value;

    /// <summary>The scenario with a letter.</summary>
    public static IntervalScenario Of(char letter)
    {
        var people = new CommuteProcess { Habit = 0.8, PassShare = 0.2 };
        return letter switch
        {
            'A' => new(letter, "independence", people, (20_000, Occasions)),
            'B' => new(letter, "lasting taste, sd 1", people with { TasteSd = 1 }, (20_000, Occasions)),
            'C' => new(letter, "serially correlated shocks, 0.6", people with { ErrorCorrelation = 0.6 }, (20_000, Occasions)),

            // Days are what there are few of: the limit is that of many days.
            'D' => new(letter, "shocks on common days, sd 0.5", people with { DateSd = 0.5 }, (200, 2_000)),
            _ => throw new ArgumentOutOfRangeException(nameof(letter)),
        };
    }

    /// <summary>Panel number <paramref name="index"/>.</summary>
    public SimulatedCommutes Panel(int persons, long seed, int index) => SimulatedCommutes.Make(persons, Occasions, process, true, seed, index);

    /// <summary>The library's own fit, from plain logit.</summary>
    public static FittedModel Fit(SimulatedCommutes made) => MaximumLikelihood.Fit(
        LikelihoodKernel.Create(made.Design, NestedLogitForm.UtilityScaled, 1), NestedLogitForm.UtilityScaled, made.Study.Estimate, WorkContext.Quiet);
}
