using System.Globalization;
using PanelChoice.Tests.Support;

namespace PanelChoice.Calibration;

/// <summary>One cell of a size and power table: how the simulated people behave, how many, and which model is fitted to them.</summary>
internal sealed record Cell(int Persons, int Occasions, int Panels, long Seed, string Design, double? Strength, bool LastChoice, int Threads)
{
    public const string Usage = """
        Size, power and hit rates of the independence battery on simulated commuters.

          --persons N      persons of a panel                                        (40)
          --occasions N    occasions of a person                                     (20)
          --panels N       panels                                                    (200)
          --seed N         seed                                                      (1)
          --design NAME    iid, habit, taste, nest-taste, errors, date, date-errors, habit-taste, habit-errors   (iid)
          --strength X     habit 0.8; taste, nest-taste 1; errors 0.6; date, date-errors 0.5; of the second part in habit-taste, habit-errors
          --model NAME     static, or dynamic: with the last choice                  (static)
          --threads N      panels worked on at once                                  (1)
        """;

    /// <summary>What moves the simulated people.</summary>
    public CommuteProcess Process => Design switch
    {
        "iid" => new CommuteProcess(),
        "habit" => new CommuteProcess { Habit = Strength ?? 0.8 },
        "taste" => new CommuteProcess { TasteSd = Strength ?? 1 },
        "nest-taste" => new CommuteProcess { NestTasteSd = Strength ?? 1 },
        "errors" => new CommuteProcess { ErrorCorrelation = Strength ?? 0.6 },
        "date" => new CommuteProcess { DateSd = Strength ?? 0.5 },
        "date-errors" => new CommuteProcess { DateSd = Strength ?? 0.5, DateCorrelation = 0.8 },
        "habit-taste" => new CommuteProcess { Habit = 0.8, TasteSd = Strength ?? 1 },
        "habit-errors" => new CommuteProcess { Habit = 0.8, ErrorCorrelation = Strength ?? 0.6 },
        _ => throw new FormatException($"no design is called '{Design}'"),
    };

    /// <summary>Reads the options; a message instead when one is wrong.</summary>
    public static (Cell? Cell, string? Wrong) Read(string[] arguments)
    {
        var cell = new Cell(40, 20, 200, 1, "iid", null, false, 1);
        for (var i = 0; i < arguments.Length; i += 2)
        {
            if (i + 1 == arguments.Length) return (null, $"{arguments[i]} needs a value");
            try
            {
                cell = With(cell, arguments[i], arguments[i + 1]);
            }
            catch (FormatException wrong)
            {
                return (null, $"{arguments[i]} {arguments[i + 1]}: {wrong.Message}");
            }
        }

        return (cell, null);
    }

    private static Cell With(Cell cell, string option, string value)
    {
        int Whole() => int.Parse(value, NumberStyles.None, CultureInfo.InvariantCulture);
        var next = option switch
        {
            "--persons" => cell with { Persons = Whole() },
            "--occasions" => cell with { Occasions = Whole() },
            "--panels" => cell with { Panels = Whole() },
            "--seed" => cell with { Seed = Whole() },
            "--design" => cell with { Design = value },
            "--strength" => cell with { Strength = double.Parse(value, CultureInfo.InvariantCulture) },
            "--model" => cell with { LastChoice = value switch { "static" => false, "dynamic" => true, _ => throw new FormatException("static or dynamic") } },
            "--threads" => cell with { Threads = Whole() },
            _ => throw new FormatException("no such option"),
        };
        _ = next.Process;
        return next;
    }
}
