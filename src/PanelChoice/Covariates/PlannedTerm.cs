using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>A term with <c>levels</c> written out and alternatives resolved: ready to be given values.</summary>
/// <param name="Specification">The term as the user wrote it.</param>
/// <param name="Index">Its index among the terms.</param>
/// <param name="Name">Name of the term; with a level, "name: value".</param>
/// <param name="Level">Text value that counts as 1; null for anything but a text column.</param>
/// <param name="Applies">Alternatives that get a coefficient, ascending (without the base).</param>
internal sealed record PlannedTerm(TermSpecification Specification, int Index, string Name, string? Level, ImmutableArray<int> Applies)
{
    /// <summary>Whether it is one of the indicators of a text column with <c>levels</c>.</summary>
    public bool IsOneOfLevels => Specification.Source is ColumnSource { Levels: true };
}
