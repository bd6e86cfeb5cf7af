using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Simulation;

/// <summary>The parameters that a demo panel is made with, under the names that its study file gives to its terms and nests.</summary>
/// <param name="Constants">Constant of each alternative, 0 for the base.</param>
/// <param name="JourneyTime">Utility of a minute under way.</param>
/// <param name="Cost">Utility of a coin.</param>
/// <param name="LastDelay">Utility of a minute's delay of the same mode on the working day before.</param>
/// <param name="SeasonTicket">Utility of the river modes to the holder of a season ticket.</param>
/// <param name="Rain">Utility of cycling on a wet day.</param>
/// <param name="Habit">Utility of the mode chosen on the working day before.</param>
/// <param name="River">Dissimilarity of the river nest.</param>
/// <param name="Road">Dissimilarity of the road nest.</param>
/// <param name="TasteDeviation">Standard deviation of a person's lasting taste for each mode.</param>
internal sealed record DemoTruth(
    ImmutableArray<double> Constants, double JourneyTime, double Cost, double LastDelay, double SeasonTicket, double Rain, double Habit,
    double River, double Road, double TasteDeviation)
{
    /// <summary>Modes in ordinal order.</summary>
    public static ImmutableArray<string> Modes { get; } = ["bus", "cycle", "drive", "ferry", "hydrofoil"];

    /// <summary>River boats, road vehicles, and cycling on its own.</summary>
    public static NestTree Tree { get; } = new(
        Modes,
        [new NestNode("river", [Ferry, Hydrofoil], null, 0), new NestNode("road", [Bus, Drive], null, 1), new NestNode("", [Cycle, 5, 6], 1, 2)]);

    public const int Bus = 0;
    public const int Cycle = 1;
    public const int Drive = 2;
    public const int Ferry = 3;
    public const int Hydrofoil = 4;

    /// <summary>Lasting tastes and habit.</summary>
    public static DemoTruth Habitual { get; } = new([0, 0.2, 1.2, 0.1, 0.4], -0.06, -0.3, -0.05, 0.6, -1.2, 0.9, 0.5, 0.7, 0.9);

    /// <summary>The same town without either.</summary>
    public static DemoTruth Quiet { get; } = Habitual with { Habit = 0, TasteDeviation = 0 };

    /// <summary>True value of each parameter of the study, by its label.</summary>
    public IReadOnlyDictionary<string, double> ByLabel => Modes.Skip(1).Select((m, i) => ($"constant [{m}]", Constants[i + 1]))
        .Concat(
        [
            ("journey time", JourneyTime), ("cost", Cost), ("last delay", LastDelay), ("season ticket", SeasonTicket), ("rain", Rain),
            ("same as yesterday", Habit), ("river", River), ("road", Road),
        ])
        .ToDictionary(x => x.Item1, x => x.Item2);
}
