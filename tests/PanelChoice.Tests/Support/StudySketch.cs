using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Tests.Support;

/// <summary>
/// Studies made by hand, for tests of the stages that read data. The columns are person, day, mode, chosen; whatever else a test needs it
/// adds.
/// </summary>
internal static class StudySketch
{
    public static StudySpecification Over(
        string path, ImmutableArray<TermSpecification> terms = default, string? occasion = "day", string? offered = null, string? weight = null,
        string cluster = "person", PreviousRule? previous = null, ImmutableArray<NestSpecification> nests = default) => new(
            "", "study.toml", "[history]\nholidays = []\nprevious = \"stated\"\n", new string('0', 64),
            new PanelSource(Path.GetFileName(path), path, "person", occasion, "mode", "chosen", offered, weight, null),
            new HistorySpecification(previous, [], null, MissingHistory.Drop),
            nests.IsDefault ? [] : nests,
            terms.IsDefault ? [] : terms,
            new EstimateSettings(NestedLogitForm.UtilityScaled, 1, 7),
            new InferenceSettings(cluster, 0.95, JackknifeKind.Auto, 0, 7),
            new DiagnosticsSettings(5, 0.05, 9999, 7));

    /// <summary>Terms that read columns as numbers.</summary>
    public static ImmutableArray<TermSpecification> Numbers(params string[] columns) => [.. columns.Select(c => Term(c, Column(c)))];

    /// <summary>Terms that read columns as text.</summary>
    public static ImmutableArray<TermSpecification> Texts(params string[] columns) =>
        [.. columns.Select(c => Term(c + " is", new ColumnSource(c, new Now(), null, true, null)))];

    public static TermSpecification Term(string name, TermSource source, int line = 20) =>
        new(name, source, [], false, null, null, false, 1, null, null, line);

    public static ColumnSource Column(string name, ColumnMoment? moment = null) => new(name, moment ?? new Now(), null, false, null);
}
