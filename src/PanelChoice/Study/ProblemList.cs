using System.Collections.Immutable;
using System.Globalization;

namespace PanelChoice.Study;

/// <summary>
/// Gathers the problems of a data file. Of each kind (the problem's id) only the first ones are listed, because one bad column can fail on
/// every row; the others are counted, and the line that closes a shortened list says how many there are in all.
/// </summary>
internal sealed class ProblemList
{
    /// <summary>How many problems of one kind are listed.</summary>
    public const int Listed = 20;

    private readonly Dictionary<string, Kind> kinds = new(StringComparer.Ordinal);

    /// <summary>Whether nothing is wrong.</summary>
    public bool IsEmpty => kinds.Count == 0;

    /// <summary>
    /// Counts one more problem of a kind. True while it belongs to those that are listed: then the caller makes it and hands it to
    /// <see cref="List"/>. Making the sentence only then keeps a file with millions of bad cells from costing millions of sentences.
    /// </summary>
    public bool Count(string id)
    {
        if (!kinds.TryGetValue(id, out var kind)) kinds[id] = kind = new Kind();
        kind.Total++;
        return kind.Problems.Count < Listed;
    }

    /// <summary>Lists a problem that <see cref="Count"/> asked for.</summary>
    public void List(Problem problem) => kinds[problem.Id].Problems.Add(problem);

    /// <summary>Counts a problem and lists it if it is among the first of its kind.</summary>
    public void Add(Problem problem)
    {
        if (Count(problem.Id)) List(problem);
    }

    /// <summary>
    /// The problems of several lists as one: kinds in the order in which the file first shows them, each kind's problems in the order of
    /// rows (within a row in the order of the lists), cut to the first <see cref="Listed"/> and closed by the total.
    /// </summary>
    public static ImmutableArray<Problem> InRowOrder(params IEnumerable<ProblemList> lists)
    {
        var joined = lists.SelectMany(list => list.kinds).GroupBy(kind => kind.Key, kind => kind.Value, StringComparer.Ordinal)
            .Select(kind => (Total: kind.Sum(k => k.Total), First: kind.SelectMany(k => k.Problems).OrderBy(p => p.Row ?? 0).Take(Listed).ToList()))
            .OrderBy(kind => kind.First[0].Row ?? 0);
        return [.. joined.SelectMany(kind => kind.Total > kind.First.Count ? kind.First.Append(Closing(kind.First[^1], kind.Total)) : kind.First)];
    }

    private static Problem Closing(Problem last, long total) => new(
        last.Id, last.File,
        string.Create(CultureInfo.InvariantCulture, $"{total:N0} problems of this kind in all, of which the first {Listed} are listed"),
        "put the file right at its source, where all of them may have one cause")
    {
        Total = total,
    };

    private sealed class Kind
    {
        public long Total { get; set; }

        public List<Problem> Problems { get; } = [];
    }
}
