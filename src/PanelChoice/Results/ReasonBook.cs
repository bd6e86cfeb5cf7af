using System.Collections.Immutable;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>Lets figures into the result and writes down why one is missing; what is not finite counts as missing.</summary>
internal sealed class ReasonBook
{
    private readonly List<MissingFigure> reasons = [];

    public ImmutableArray<MissingFigure> Reasons => [.. reasons];

    public void Note(string path, string reason) => reasons.Add(new MissingFigure(path, reason));

    public double? Number(string path, double? value, string reason)
    {
        if (value is { } number && double.IsFinite(number)) return number;
        Note(path, reason);
        return null;
    }

    public Interval? Interval(string path, Interval? value, string reason)
    {
        if (value is { } interval && double.IsFinite(interval.Low) && double.IsFinite(interval.High)) return interval;
        Note(path, reason);
        return null;
    }
}
