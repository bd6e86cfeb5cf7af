using PanelChoice.Covariates;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;
using Xunit.Abstractions;

namespace PanelChoice.Tests.Diagnostics;

/// <summary>Size and power of the detector on seeded simulated panels of 40 persons x 20 occasions, each fitted anew.</summary>
public class SimulatedSizeTests(ITestOutputHelper output)
{
    private const int Persons = 40;
    private const int Occasions = 20;
    private const double Level = 0.05;
    private const int Draws = 2999;

    [Fact]
    public void The_detector_alarms_in_two_to_nine_percent_of_independent_panels()
    {
        var rates = Simulate(400, new CommuteProcess(), false, 101);
        Assert.InRange(rates.Alarms, 0.02, 0.09);
    }

    [Fact]
    public void It_keeps_its_size_under_true_habit_with_the_last_choice_in_the_model_and_would_not_without_the_estimation_effect()
    {
        var rates = Simulate(400, new CommuteProcess { Habit = 0.8 }, true, 202);
        Assert.InRange(rates.Alarms, 0.02, 0.09);
        Assert.False(rates.AlarmsWithoutEstimationEffect is >= 0.02 and <= 0.09, $"{rates.AlarmsWithoutEstimationEffect}");
    }

    [Fact]
    public void It_finds_lasting_taste_in_at_least_ninety_five_of_a_hundred_panels()
    {
        var rates = Simulate(100, new CommuteProcess { TasteSd = 1 }, false, 303);
        Assert.InRange(rates.Alarms, 0.95, 1);
    }

    private (double Alarms, double AlarmsWithoutEstimationEffect) Simulate(int panels, CommuteProcess process, bool lastChoice, long seed)
    {
        var outcomes = new (bool Fitted, bool Alarm, bool WithoutEffect)[panels];
        Parallel.For(0, panels, new ParallelOptions { MaxDegreeOfParallelism = 2 }, i =>
        {
            var made = SimulatedCommutes.Make(Persons, Occasions, process, lastChoice, seed, i);
            var design = made.Design;
            var fit = NewtonFit.From(design, NestedLogitForm.UtilityScaled, made.Truth);
            if (fit.Status != FitStatus.Converged) return;
            var positions = OccasionPositions.Of(made.Study.History, EstimationSample.Of(made.Covariates));
            var battery = ScoreBattery.Compute(design, fit.Form, fit.Parameters, positions, 1, null, false, 1)!;
            var detector = DecayGridDetector.Of(battery, Draws, 7)!;
            outcomes[i] = (true, detector.PValue <= Level, WithoutEstimationEffect(battery) <= Level);
        });

        var fitted = outcomes.Count(o => o.Fitted);
        Assert.InRange(fitted, 0.98 * panels, panels);
        var result = ((double)outcomes.Count(o => o.Alarm) / fitted, (double)outcomes.Count(o => o.WithoutEffect) / fitted);
        output.WriteLine($"{fitted} of {panels} panels fitted; alarms {result.Item1:P2}, without the estimation effect {result.Item2:P2}");
        return result;
    }

    /// <summary>The same detector with A_mm in place of V: as if the parameters were known.</summary>
    private static double WithoutEstimationEffect(ScoreBattery battery)
    {
        var naive = battery with
        {
            Decays = [.. battery.Decays.Select(d => d with { Variance = d.RawVariance })],
            DecayCovariance = battery.RawDecayCovariance,
        };
        return DecayGridDetector.Of(naive, Draws, 7)!.PValue;
    }
}
