namespace PanelChoice.Benchmarks;

/// <summary>Size and terms of a synthetic commute panel.</summary>
/// <param name="Name">What tables call it.</param>
/// <param name="Persons">Persons.</param>
/// <param name="Occasions">Occasions of each person.</param>
/// <param name="Alternatives">Alternatives: 5 or 6.</param>
/// <param name="HasStock">Whether a habit stock is among the terms.</param>
/// <param name="Singles">Terms that enter one alternative only: 2 or 3.</param>
internal sealed record CommuteShape(string Name, int Persons, int Occasions, int Alternatives, bool HasStock, int Singles)
{
    /// <summary>500 persons x 20 occasions x 5 alternatives, 12 parameters.</summary>
    public static CommuteShape Small { get; } = new("S", 500, 20, 5, HasStock: false, Singles: 2);

    /// <summary>10,000 persons x 30 occasions x 6 alternatives, 15 parameters.</summary>
    public static CommuteShape Medium { get; } = new("M", 10_000, 30, 6, HasStock: true, Singles: 3);

    /// <summary>30,000 persons x 60 occasions x 6 alternatives, 15 parameters.</summary>
    public static CommuteShape Large { get; } = new("L", 30_000, 60, 6, HasStock: true, Singles: 3);

    /// <summary>Number of situations.</summary>
    public int Situations => Persons * Occasions;

    /// <summary>The case with a given letter.</summary>
    public static CommuteShape Of(string name) => name switch
    {
        "S" => Small,
        "M" => Medium,
        "L" => Large,
        _ => throw new ArgumentException($"There is no case {name}.", nameof(name)),
    };

    /// <summary>A panel with the terms of M and L and about the given number of situations: 20 occasions for each person.</summary>
    public static CommuteShape OfSituations(int situations) => Large with { Name = $"{situations:E0}", Persons = situations / 20, Occasions = 20 };
}
