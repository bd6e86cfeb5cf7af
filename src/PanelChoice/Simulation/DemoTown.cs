using MathNet.Numerics.Distributions;
using PanelChoice.Numerics;

namespace PanelChoice.Simulation;

/// <summary>
/// The invented estuary town of Marrowick, where everybody works across the water: its commuters, its working days, and what each mode asks
/// of each commuter on each day. All of it is a function of one seed, and every figure is rounded as the file shows it before it acts.
/// </summary>
internal sealed class DemoTown
{
    /// <summary>Number of commuters.</summary>
    public const int Commuters = 160;

    private const long Seed = 20310303;

    private readonly Cell[] cells;

    /// <summary>The town and all its days.</summary>
    public DemoTown()
    {
        Days = WorkingDays();
        Weather = [.. Days.Select((_, d) => WeatherOf(d))];
        People = [.. Enumerable.Range(0, Commuters).Select(PersonOf)];
        cells = new Cell[Commuters * Days.Count * DemoTruth.Modes.Length];
        for (var p = 0; p < Commuters; p++) FillPerson(p);
    }

    /// <summary>A day without work among the weekdays; the study file names it.</summary>
    public static DateOnly Holiday { get; } = new(2031, 4, 14);

    /// <summary>Seven weeks of weekdays, one holiday taken out.</summary>
    public IReadOnlyList<DateOnly> Days { get; }

    /// <summary>Weather of each day.</summary>
    public IReadOnlyList<Weather> Weather { get; }

    /// <summary>The commuters.</summary>
    public IReadOnlyList<Commuter> People { get; }

    /// <summary>What a mode asks of a commuter on a day.</summary>
    public Cell At(int person, int day, int mode) => cells[(((person * Days.Count) + day) * DemoTruth.Modes.Length) + mode];

    private static List<DateOnly> WorkingDays() =>
        [.. Enumerable.Range(0, 47).Select(new DateOnly(2031, 3, 3).AddDays)
            .Where(d => d.DayOfWeek is not (DayOfWeek.Saturday or DayOfWeek.Sunday) && d != Holiday)];

    private static Weather WeatherOf(int day)
    {
        var random = new CounterRandom(Seed, "demo weather", day);
        return new Weather(random.NextDouble() < 0.35, Round(Gamma.Sample(random, 4, 0.55), 1));
    }

    private Commuter PersonOf(int person)
    {
        var random = new CounterRandom(Seed, "demo commuter", person);
        var kilometres = Round(3 + Gamma.Sample(random, 3, 0.45), 1);
        var quayMinutes = Round(4 + (12 * random.NextDouble()), 1);
        var hasCar = random.NextDouble() < 0.7;
        var hasCycle = random.NextDouble() < 0.75;
        var nearUpperQuay = random.NextDouble() < 0.8;
        var hasTicket = random.NextDouble() < 0.35;
        var parking = Round(3 * random.NextDouble(), 1);

        // Most people answer nearly every day; some join late, and a third are away for a week.
        var recorded = Enumerable.Repeat(true, Days.Count).ToArray();
        var joins = random.NextDouble() < 0.15 ? 5 + random.Next(8) : 0;
        Array.Fill(recorded, false, 0, joins);
        if (random.NextDouble() < 0.33) Array.Fill(recorded, false, 5 + random.Next(Days.Count - 10), 5);
        for (var d = 0; d < recorded.Length; d++) recorded[d] &= random.NextDouble() < 0.93;
        return new Commuter($"M{person + 1:000}", kilometres, quayMinutes, hasCar, hasCycle, nearUpperQuay, hasTicket, parking, recorded);
    }

    private void FillPerson(int person)
    {
        var c = People[person];
        var random = new CounterRandom(Seed, "demo journeys", person);
        for (var d = 0; d < Days.Count; d++)
        {
            var (isWet, wind) = Weather[d];
            var rain = isWet ? 1 : 0;
            var carIsFree = random.NextDouble() > 0.06;
            var tideSuits = random.NextDouble() > 0.04;
            var hasSeat = random.NextDouble() > 0.1;
            double Spread(double shape, double mean) => Gamma.Sample(random, shape, shape / mean);
            void Set(int mode, bool runs, double minutes, double cost, double delay) =>
                cells[(((person * Days.Count) + d) * DemoTruth.Modes.Length) + mode] = new Cell(runs, Round(minutes, 1), Round(cost, 2), Round(delay, 1));

            Set(DemoTruth.Bus, true, 9 + (2.6 * c.Kilometres) + Spread(2, 4 + (2 * rain)), 1.6 + (0.08 * c.Kilometres), Spread(1.2, 4 + (3 * rain)));
            Set(DemoTruth.Cycle, c.HasCycle && c.Kilometres < 12, 4 + (3.6 * c.Kilometres) + Spread(2, 2), 0, 0);
            Set(DemoTruth.Drive, c.HasCar && carIsFree, 6 + (1.7 * c.Kilometres) + Spread(2, 4 + (2 * rain)), 1.5 + c.Parking + (0.28 * c.Kilometres), Spread(1.2, 3.5 + (2 * rain)));
            Set(DemoTruth.Ferry, tideSuits, c.QuayMinutes + 14 + Spread(2, 3), c.HasTicket ? 0.6 : 2.4, Spread(1.2, 2 + (0.3 * wind)));
            Set(DemoTruth.Hydrofoil, c.NearUpperQuay && hasSeat, c.QuayMinutes + 7 + Spread(2, 2), c.HasTicket ? 2.2 : 4.6, Spread(1.2, 2.5));
        }
    }

    private static double Round(double value, int digits) => Math.Round(value, digits, MidpointRounding.AwayFromZero);
}

/// <summary>A day's weather.</summary>
/// <param name="IsWet">Whether it rains.</param>
/// <param name="Wind">Metres a second.</param>
internal sealed record Weather(bool IsWet, double Wind);

/// <summary>A commuter of Marrowick.</summary>
/// <param name="Name">Invented id.</param>
/// <param name="Kilometres">Way to work by the bridge.</param>
/// <param name="QuayMinutes">Walk to the quay.</param>
/// <param name="HasCar">Whether there is a car at home.</param>
/// <param name="HasCycle">Whether there is a cycle at home.</param>
/// <param name="NearUpperQuay">Whether the hydrofoil can be reached.</param>
/// <param name="HasTicket">Whether the commuter holds a season ticket for the river.</param>
/// <param name="Parking">What parking costs, in coins.</param>
/// <param name="Recorded">Whether the diary has an entry, for each working day.</param>
internal sealed record Commuter(
    string Name, double Kilometres, double QuayMinutes, bool HasCar, bool HasCycle, bool NearUpperQuay, bool HasTicket, double Parking, bool[] Recorded);

/// <summary>A mode on one commuter's day.</summary>
/// <param name="Runs">Whether it can be taken.</param>
/// <param name="Minutes">Time under way.</param>
/// <param name="Cost">Cost in coins.</param>
/// <param name="Delay">Minutes late.</param>
internal readonly record struct Cell(bool Runs, double Minutes, double Cost, double Delay);
