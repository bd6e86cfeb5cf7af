using System.Collections.Immutable;

namespace PanelChoice.Data;

/// <summary>What is known of a data file as a whole once it was read: enough to read it again in parts that mean the same as the whole.</summary>
/// <param name="File">Data file as the study writes it.</param>
/// <param name="Sha256">Lower-case hexadecimal SHA-256 of its bytes.</param>
/// <param name="Rows">Number of rows.</param>
/// <param name="OccasionKind">What its occasions are.</param>
/// <param name="Persons">Persons in the panel's order.</param>
/// <param name="Alternatives">Alternatives in ordinal order.</param>
/// <param name="Texts">The values of each text column in ordinal order.</param>
internal sealed record TableOutline(
    string File, string Sha256, long Rows, OccasionKind OccasionKind, ImmutableArray<string> Persons, ImmutableArray<string> Alternatives,
    ImmutableDictionary<string, ImmutableArray<string>> Texts);
