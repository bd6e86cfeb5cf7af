namespace PanelChoice.Diagnostics;

/// <summary>What the two tests say together.</summary>
/// <param name="Verdict">None found, or dependence.</param>
/// <param name="Serial">Whether the detector passes: dependence along a person's own past.</param>
/// <param name="CommonDays">Whether the date score passes; null when it could not be tested.</param>
internal sealed record JointVerdict(Verdict Verdict, bool Serial, bool? CommonDays);

/// <summary>
/// Joins detector and date score by Holm's step-down correction (Holm 1979): the smaller p-value is held against level / 2, the larger,
/// if the smaller passed, against level. With the detector alone it is held against level.
/// </summary>
internal static class VerdictRule
{
    /// <summary>Judges the two p-values.</summary>
    /// <param name="detector">p-value of the detector.</param>
    /// <param name="date">p-value of the date score; null when it could not be tested.</param>
    /// <param name="level">Significance level.</param>
    public static JointVerdict Judge(double detector, double? date, double level)
    {
        var any = date is { } d ? Math.Min(detector, d) <= level / 2 : detector <= level;
        var serial = any && detector <= level;
        bool? common = date is null ? null : any && date <= level;
        return new JointVerdict(serial || common == true ? Verdict.Dependence : Verdict.NoneFound, serial, common);
    }
}
