namespace PanelChoice.Cli;

/// <summary>A design that is kept in a file and read from there.</summary>
/// <param name="File">The store's file.</param>
/// <param name="Megabytes">Memory that the run may take beside what every run takes.</param>
internal sealed record KeptDesign(string File, int Megabytes)
{
    /// <summary>The budget where none is stated.</summary>
    public const int UsualMegabytes = 256;

    /// <summary>Bytes of the design to hold: half of the budget, because the sums over persons and clusters grow with the panel too.</summary>
    public long BytesHeld => Megabytes * 500_000L;
}
