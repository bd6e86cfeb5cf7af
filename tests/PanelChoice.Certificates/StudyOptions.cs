using System.Globalization;
using PanelChoice.Estimation;

namespace PanelChoice.Certificates;

/// <summary>How large a study is made, and to which tolerance its replicates are taken.</summary>
internal sealed record StudyOptions(int Panels, int Draws, int Deletions, long Seed, double Tolerance, int Threads)
{
    public const string Usage = """
        True distances of replicates from their maxima, held against their certificates, on simulated panels of all sorts.

          --panels N       panels                                                            (1000)
          --draws N        bootstrap replicates of each                                      (30)
          --deletions N    refits without one cluster, of each                               (5)
          --seed N         seed                                                              (1)
          --tolerance X    distance, in standard errors, at which a replicate may stop       (1e-5)
          --threads N      panels worked on at once                                          (1)
        """;

    /// <summary>Reads the options; a message instead when one is wrong.</summary>
    public static (StudyOptions? Options, string? Wrong) Read(string[] arguments)
    {
        var options = new StudyOptions(1000, 30, 5, 1, ClusterRefitter.Tolerance, 1);
        for (var i = 0; i < arguments.Length; i += 2)
        {
            if (i + 1 == arguments.Length) return (null, $"{arguments[i]} needs a value");
            try
            {
                options = With(options, arguments[i], arguments[i + 1]);
            }
            catch (Exception wrong) when (wrong is FormatException or OverflowException)
            {
                return (null, $"{arguments[i]} {arguments[i + 1]}: {wrong.Message}");
            }
        }

        return (options, null);
    }

    private static StudyOptions With(StudyOptions options, string option, string value)
    {
        int Whole(int least) =>
            int.Parse(value, NumberStyles.None, CultureInfo.InvariantCulture) is var n && n >= least ? n : throw new FormatException($"at least {least}");
        return option switch
        {
            "--panels" => options with { Panels = Whole(1) },
            "--draws" => options with { Draws = Whole(0) },
            "--deletions" => options with { Deletions = Whole(0) },
            "--seed" => options with { Seed = Whole(0) },
            "--tolerance" => options with
            {
                Tolerance = double.Parse(value, CultureInfo.InvariantCulture) is var t and > 0 and < 1 ? t : throw new FormatException("above 0 and below 1"),
            },
            "--threads" => options with { Threads = Whole(1) },
            _ => throw new FormatException("no such option"),
        };
    }
}
