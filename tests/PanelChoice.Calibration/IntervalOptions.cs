using System.Globalization;

namespace PanelChoice.Calibration;

/// <summary>What a run of the interval study does.</summary>
/// <param name="Scenarios">Letters of the scenarios.</param>
/// <param name="Persons">Numbers of persons, a cell for each.</param>
/// <param name="Panels">Panels of each cell.</param>
/// <param name="Replicates">Bootstrap replicates of each panel; 0 for none.</param>
/// <param name="Seed">Seed.</param>
/// <param name="Threads">Panels worked on at once.</param>
/// <param name="Restart">File that keeps what was found panel by panel, and from which a later run goes on; null for none.</param>
internal sealed record IntervalOptions(string Scenarios, int[] Persons, int Panels, int Replicates, long Seed, int Threads, string? Restart)
{
    public const string Usage = """
        Rejection rates (nominal 5 percent) and coverage (of 95 percent intervals) of every interval kind on simulated commuters.

          intervals
          --scenarios ABCD  A independence, B lasting taste, C serially correlated shocks, D shocks on common days   (ABCD)
          --persons LIST    numbers of persons, with commas                            (10,20,40,150)
          --panels N        panels of each cell                                        (1000)
          --replicates N    bootstrap replicates of each panel                         (0)
          --seed N          seed                                                       (1)
          --threads N       panels worked on at once                                   (1)
          --restart FILE    keeps every panel's outcome in FILE and goes on from there (none)
        """;

    /// <summary>Reads the options; a message instead when one is wrong.</summary>
    public static (IntervalOptions? Options, string? Wrong) Read(IReadOnlyList<string> arguments)
    {
        var options = new IntervalOptions("ABCD", [10, 20, 40, 150], 1000, 0, 1, 1, null);
        for (var i = 0; i < arguments.Count; i += 2)
        {
            if (i + 1 == arguments.Count) return (null, $"{arguments[i]} needs a value");
            try
            {
                options = With(options, arguments[i], arguments[i + 1]);
            }
            catch (FormatException wrong)
            {
                return (null, $"{arguments[i]} {arguments[i + 1]}: {wrong.Message}");
            }
        }

        return (options, null);
    }

    private static IntervalOptions With(IntervalOptions options, string option, string value) => option switch
    {
        "--scenarios" => value.All(c => c is >= 'A' and <= 'D') ? options with { Scenarios = value } : throw new FormatException("letters A to D"),
        "--persons" => options with { Persons = [.. value.Split(',').Select(Whole)] },
        "--panels" => options with { Panels = Whole(value) },
        "--replicates" => options with { Replicates = Whole(value) },
        "--seed" => options with { Seed = Whole(value) },
        "--threads" => options with { Threads = Math.Max(1, Whole(value)) },
        "--restart" => options with { Restart = value },
        _ => throw new FormatException("no such option"),
    };

    private static int Whole(string value) => int.Parse(value, NumberStyles.None, CultureInfo.InvariantCulture);
}
