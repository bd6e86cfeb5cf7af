namespace PanelChoice.Cli;

/// <summary>A design that is kept in a file and read from there.</summary>
/// <param name="File">The store's file.</param>
/// <param name="Megabytes">Memory that the run may take beside what every run takes.</param>
internal sealed record KeptDesign(string File, int Megabytes)
{
    /// <summary>The budget where none is stated.</summary>
    public const int UsualMegabytes = 256;

    /// <summary>The budget in bytes.</summary>
    public long Bytes => Megabytes * 1_000_000L;
}
