using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>Weights of situations: those of their persons, or 1 in a range of situations and 0 outside it.</summary>
internal readonly ref struct LaneWeights
{
    private readonly ReadOnlySpan<double> person;
    private readonly int from;
    private readonly int to;

    private LaneWeights(ReadOnlySpan<double> person, int from, int to)
    {
        this.person = person;
        this.from = from;
        this.to = to;
    }

    /// <summary>One weight for each of the design's persons.</summary>
    public static LaneWeights OfPersons(ReadOnlySpan<double> weight) => new(weight, 0, int.MaxValue);

    /// <summary>1 from one situation to the one before another, else 0.</summary>
    public static LaneWeights One(int from, int to) => new([], from, to);

    /// <summary>Fills lanes; padding gets 0.</summary>
    /// <param name="design">The design.</param>
    /// <param name="first">Situation of the first lane.</param>
    /// <param name="end">Situation after the block's last.</param>
    /// <param name="lanes">Receives the weights.</param>
    public void Fill(ChoiceDesign design, int first, int end, Span<double> lanes)
    {
        var filled = Math.Min(lanes.Length, end - first);
        lanes[filled..].Clear();
        if (person.IsEmpty)
        {
            for (var lane = 0; lane < filled; lane++) lanes[lane] = first + lane >= from && first + lane < to ? 1 : 0;
            return;
        }

        for (int lane = 0, p = design.PersonOf[first]; lane < filled; p++)
        {
            var run = Math.Min(filled, design.PersonStart[p + 1] - first) - lane;
            lanes.Slice(lane, run).Fill(person[p]);
            lane += run;
        }
    }
}
