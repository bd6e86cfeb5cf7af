using System.Collections.Immutable;

namespace PanelChoice.Data;

/// <summary>What the occasion column holds.</summary>
public enum OccasionKind
{
    /// <summary>There is none: each person has one occasion.</summary>
    None,

    /// <summary>Whole numbers.</summary>
    WholeNumber,

    /// <summary>Dates, held as days since 0001-01-01 (<see cref="DateOnly.DayNumber"/>).</summary>
    Date,
}

/// <summary>A text column held as whole-number codes and their values.</summary>
/// <param name="Codes">Code of each row, an index into <paramref name="Levels"/>, or <see cref="NoValue"/>.</param>
/// <param name="Levels">The distinct values in ordinal order.</param>
public sealed record CodedColumn(ImmutableArray<int> Codes, ImmutableArray<string> Levels)
{
    /// <summary>The code of an empty cell; only text attributes have it, and only on rows that were not offered.</summary>
    public const int NoValue = -1;
}

/// <summary>The needed columns of a long data file, row by row in the file's order, typed and checked cell by cell.</summary>
/// <param name="File">Data file as the study writes it.</param>
/// <param name="Sha256">Lower-case hexadecimal SHA-256 of the file's bytes as stored.</param>
/// <param name="SourceRow">Row number of the file for each row (CSV: the header is row 1; Parquet: the first record is row 1).</param>
/// <param name="Person">Person ids.</param>
/// <param name="OccasionKind">What <paramref name="Occasion"/> holds.</param>
/// <param name="Occasion">Whole number or day number of each row; 0 throughout without an occasion column.</param>
/// <param name="Alternative">Alternative names.</param>
/// <param name="Chosen">Whether the row is the chosen one.</param>
/// <param name="Offered">Whether the alternative was available.</param>
/// <param name="Weight">Sampling weight of each row; empty without weights.</param>
/// <param name="Numbers">Numeric columns by name; NaN marks an empty cell on a row that was not offered.</param>
/// <param name="Texts">Text columns by name (columns used with <c>is</c> or <c>levels</c>, and the cluster column).</param>
public sealed record ChoiceTable(
    string File,
    string Sha256,
    ImmutableArray<long> SourceRow,
    CodedColumn Person,
    OccasionKind OccasionKind,
    ImmutableArray<long> Occasion,
    CodedColumn Alternative,
    ImmutableArray<bool> Chosen,
    ImmutableArray<bool> Offered,
    ImmutableArray<double> Weight,
    ImmutableDictionary<string, ImmutableArray<double>> Numbers,
    ImmutableDictionary<string, CodedColumn> Texts)
{
    /// <summary>Number of rows.</summary>
    public int Rows => SourceRow.Length;
}
