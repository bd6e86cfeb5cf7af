using System.Collections.Immutable;
using System.Globalization;
using System.Text;
using MathNet.Numerics.Distributions;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Simulation;

/// <summary>A file of the demonstration.</summary>
/// <param name="Name">File name, without a folder.</param>
/// <param name="Text">Its whole text, UTF-8 with LF.</param>
public sealed record DemoFile(string Name, string Text)
{
    /// <summary>Whether it is a study file, which <c>estimate</c> can run on.</summary>
    public bool IsStudy => Name.EndsWith(".toml", StringComparison.Ordinal);
}

/// <summary>
/// The demonstration: two invented panels of the commuters of Marrowick, the same people on the same days. In the first they have habits and
/// lasting tastes, in the second neither. Everything in it is invented; it is a fixed function of the seeds below.
/// </summary>
public static class DemoPanel
{
    private const long HabitSeed = 1;
    private const long QuietSeed = 6;

    /// <summary>The four files: for each panel its data and its study file.</summary>
    public static ImmutableArray<DemoFile> Files()
    {
        var town = new DemoTown();
        return
        [
            new DemoFile("marrowick-habit.csv", Data(town, DemoTruth.Habitual, HabitSeed)),
            new DemoFile("marrowick-habit.toml", DemoStudy.Habit),
            new DemoFile("marrowick-quiet.csv", Data(town, DemoTruth.Quiet, QuietSeed)),
            new DemoFile("marrowick-quiet.toml", DemoStudy.Quiet),
        ];
    }

    /// <summary>The data of a panel: a row for each recorded person-day and mode.</summary>
    internal static string Data(DemoTown town, DemoTruth truth, long seed)
    {
        var text = new StringBuilder("commuter,day,mode,running,taken,minutes,cost,delay,wet,season_ticket\n");
        for (var p = 0; p < town.People.Count; p++)
        {
            var commuter = town.People[p];
            var chosen = Choices(town, truth, seed, p);
            for (var d = 0; d < town.Days.Count; d++)
            {
                if (!commuter.Recorded[d]) continue;
                for (var j = 0; j < DemoTruth.Modes.Length; j++)
                {
                    var cell = town.At(p, d, j);
                    text.Append(
                        CultureInfo.InvariantCulture,
                        $"{commuter.Name},{town.Days[d]:yyyy-MM-dd},{DemoTruth.Modes[j]},{Flag(cell.Runs)},{Flag(chosen[d] == j)},{cell.Minutes:0.0},{cell.Cost:0.00},{cell.Delay:0.0},{Flag(town.Weather[d].IsWet)},{Flag(commuter.HasTicket)}\n");
                }
            }
        }

        return text.ToString();
    }

    /// <summary>One commuter's choices on all working days, recorded or not: a day without an entry in the diary was still lived.</summary>
    private static int[] Choices(DemoTown town, DemoTruth truth, long seed, int person)
    {
        var random = new CounterRandom(seed, "demo choices", person);
        var taste = DemoTruth.Modes.Select(_ => truth.TasteDeviation * Normal.Sample(random, 0, 1)).ToArray();
        var probabilities = new TreeProbabilities(DemoTruth.Tree, NestedLogitForm.UtilityScaled);
        probabilities.SetDissimilarities([truth.River, truth.Road, 1]);
        return ForwardChoices.Simulate(probabilities, town.Days.Count, random, (day, chosen, utility, offered) =>
        {
            for (var j = 0; j < utility.Length; j++)
            {
                var cell = town.At(person, day, j);
                offered[j] = cell.Runs;
                utility[j] = truth.Constants[j] + taste[j] + (truth.JourneyTime * cell.Minutes) + (truth.Cost * cell.Cost);
                if (day > 0) utility[j] += (truth.LastDelay * town.At(person, day - 1, j).Delay) + (chosen[^1] == j ? truth.Habit : 0);
                if (j is DemoTruth.Ferry or DemoTruth.Hydrofoil && town.People[person].HasTicket) utility[j] += truth.SeasonTicket;
                if (j == DemoTruth.Cycle && town.Weather[day].IsWet) utility[j] += truth.Rain;
            }
        });
    }

    private static char Flag(bool value) => value ? '1' : '0';
}
