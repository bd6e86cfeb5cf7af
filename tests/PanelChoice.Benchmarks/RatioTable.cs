namespace PanelChoice.Benchmarks;

/// <summary>What a ratio should come to.</summary>
/// <param name="Sign">Whether it should be at least or at most the bound.</param>
/// <param name="Bound">The bound.</param>
internal sealed record Goal(GoalSign Sign, double Bound)
{
    public static Goal AtLeast(double bound) => new(GoalSign.AtLeast, bound);

    public static Goal AtMost(double bound) => new(GoalSign.AtMost, bound);

    public bool IsMet(double value) => Sign == GoalSign.AtLeast ? value >= Bound : value <= Bound;

    public override string ToString() => $"{(Sign == GoalSign.AtLeast ? ">=" : "<=")} {Bound:#,0.##}";
}

/// <summary>Which side of its bound a ratio should be on.</summary>
internal enum GoalSign
{
    AtLeast,
    AtMost,
}

/// <summary>The table of ratios, printed row by row as they are measured. A missed goal is a word in a row and nothing more.</summary>
internal static class RatioTable
{
    private const string Line = "{0,-4}{1,-76}{2,-9}{3,11}{4,11}{5,10}{6,10}{7,10}  {8}";

    /// <summary>Prints the heading.</summary>
    public static void Heading()
    {
        Console.WriteLine();
        Console.WriteLine(Line, "row", "what / against what", "case", "what, ms", "against", "minimum", "median", "maximum", "goal (at the median)");
    }

    /// <summary>Prints a row.</summary>
    /// <param name="number">Number of the row among the goals; empty for an extra one.</param>
    /// <param name="what">What is divided by what.</param>
    /// <param name="made">Name of the case, and how its columns are stored.</param>
    /// <param name="above">Seconds of each repetition of the first.</param>
    /// <param name="below">Seconds of each repetition of the second.</param>
    /// <param name="goal">What the ratio should come to; null for a row that only tells.</param>
    public static void Row(string number, string what, string made, double[] above, double[] below, Goal? goal = null) =>
        Row(number, what, made, $"{above.Min() * 1e3:#,0.000}", $"{below.Min() * 1e3:#,0.000}", Spread.Of(above.Zip(below, (a, b) => a / b)), goal);

    /// <summary>Prints a row of something other than times.</summary>
    /// <param name="number">Number of the row among the goals; empty for an extra one.</param>
    /// <param name="what">What is divided by what.</param>
    /// <param name="made">The case.</param>
    /// <param name="above">The first in print.</param>
    /// <param name="below">The second in print.</param>
    /// <param name="ratio">The ratio.</param>
    /// <param name="goal">What the ratio should come to; null for a row that only tells.</param>
    public static void Row(string number, string what, string made, string above, string below, Spread ratio, Goal? goal) => Console.WriteLine(
        Line, number, what, made, above, below, $"{ratio.Minimum:#,0.00}", $"{ratio.Median:#,0.00}", $"{ratio.Maximum:#,0.00}",
        goal is null ? "" : $"{goal}  {(goal.IsMet(ratio.Median) ? "met" : "missed")}");

    /// <summary>Prints a remark below a row.</summary>
    public static void Remark(string text) => Console.WriteLine($"    {text}");
}
