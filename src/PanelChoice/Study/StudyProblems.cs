using System.Collections.Immutable;

namespace PanelChoice.Study;

/// <summary>Gathers what is wrong with one study file, so that everything is reported together.</summary>
/// <param name="file">The study file's name as the user gave it.</param>
internal sealed class StudyProblems(string file)
{
    private readonly List<Problem> problems = [];

    public int Count => problems.Count;

    public void Add(string id, Place place, string what, string remedy, string? value = null) =>
        problems.Add(new Problem(id, file, what, remedy) { Line = place.Line, Position = place.Position, Value = value });

    /// <summary>The problems in the order of the file.</summary>
    public ImmutableArray<Problem> InFileOrder() => [.. problems.OrderBy(p => p.Line).ThenBy(p => p.Position)];
}
