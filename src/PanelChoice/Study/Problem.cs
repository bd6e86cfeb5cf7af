using System.Collections.Immutable;
using System.Globalization;
using System.Text;

namespace PanelChoice.Study;

/// <summary>One thing wrong with a study file or with its data: what, where, and what to do about it.</summary>
/// <param name="Id">Stable name of the kind of problem, for example <c>data.duplicate</c>; tests and machines rely on it.</param>
/// <param name="File">The file at fault, as the user wrote its name.</param>
/// <param name="What">What is wrong, as the middle of one sentence.</param>
/// <param name="Remedy">What the user can do about it, as an imperative.</param>
public sealed record Problem(string Id, string File, string What, string Remedy)
{
    /// <summary>Line of the study file, counted from 1.</summary>
    public int? Line { get; init; }

    /// <summary>Position in that line, counted from 1.</summary>
    public int? Position { get; init; }

    /// <summary>Row of the data: in CSV the header is row 1, as a spreadsheet shows it; in Parquet the first record is row 1.</summary>
    public long? Row { get; init; }

    /// <summary>Name of the data column.</summary>
    public string? Column { get; init; }

    /// <summary>The offending value as it was read.</summary>
    public string? Value { get; init; }

    /// <summary>On the line that closes a shortened list of one kind: how many problems of that kind there are in all.</summary>
    public long? Total { get; init; }

    /// <summary>The whole problem as one plain line: place, value, what is wrong, remedy.</summary>
    public string Sentence
    {
        get
        {
            var text = new StringBuilder(File);
            if (Line is { } line) text.Append(CultureInfo.InvariantCulture, $", line {line}");
            if (Position is { } position) text.Append(CultureInfo.InvariantCulture, $", column {position}");
            if (Row is { } row) text.Append(CultureInfo.InvariantCulture, $", row {row}");
            if (Column is { } column) text.Append(CultureInfo.InvariantCulture, $", column '{column}'");
            if (Value is { } value) text.Append(CultureInfo.InvariantCulture, $", value '{value}'");
            var remedy = Remedy.TrimEnd('.');
            return text.Append(": ").Append(What.TrimEnd('.')).Append("; ").Append(remedy).Append(remedy.EndsWith('?') ? "" : ".")
                .ToString().ReplaceLineEndings(" ");
        }
    }
}

/// <summary>A value, or the list of problems that kept it from being made. Bad input is a list, never an exception.</summary>
/// <typeparam name="T">The record that the stage makes.</typeparam>
public sealed record Checked<T>
    where T : class
{
    private Checked(T? value, ImmutableArray<Problem> problems)
    {
        Value = value;
        Problems = problems;
    }

    /// <summary>The record; null when <see cref="Problems"/> is not empty.</summary>
    public T? Value { get; }

    /// <summary>All problems found, in the order of the file; those of a data file kind by kind, the first twenty of each and then their total.</summary>
    public ImmutableArray<Problem> Problems { get; }

    /// <summary>The next stage's outcome where this one succeeded, or this one's problems.</summary>
    /// <typeparam name="TNext">The record that the next stage makes.</typeparam>
    /// <param name="next">The next stage.</param>
    public Checked<TNext> Then<TNext>(Func<T, Checked<TNext>> next)
        where TNext : class
    {
        ArgumentNullException.ThrowIfNull(next);
        return Value is null ? Checked<TNext>.Bad(Problems) : next(Value);
    }

    /// <summary>A record without problems.</summary>
    public static Checked<T> Good(T value) => new(value, []);

    /// <summary>Problems instead of a record.</summary>
    /// <exception cref="ArgumentException">The list is empty.</exception>
    public static Checked<T> Bad(ImmutableArray<Problem> problems) =>
        problems.IsDefaultOrEmpty ? throw new ArgumentException("A rejected input needs at least one problem.", nameof(problems)) : new(null, problems);
}
