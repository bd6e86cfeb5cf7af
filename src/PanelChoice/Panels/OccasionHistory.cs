using PanelChoice.Data;
using PanelChoice.Study;

namespace PanelChoice.Panels;

/// <summary>
/// Which recorded occasion lies k steps before or after which, under the study's rule. It looks at the recorded panel and never at the
/// estimation sample: an occasion that is left out still is the previous occasion of the next one. Only an occasion that the rule's own
/// calendar does not know (a week-end or holiday under <c>workday</c>) is nobody's history.
/// </summary>
internal sealed class OccasionHistory
{
    /// <summary>No such occasion.</summary>
    public const int None = -1;

    private readonly ChoicePanel panel;
    private readonly HistorySpecification history;
    private readonly int[] chain;
    private readonly int[] chainStart;
    private readonly int[] chainIndex;
    private readonly long[] chainAxis;
    private readonly Dictionary<int, int[]> shifts = [];

    public OccasionHistory(ChoicePanel panel, HistorySpecification history)
    {
        this.panel = panel;
        this.history = history;
        var calendar = new WorkingCalendar(history.Holidays);
        var workdays = history.Previous == PreviousRule.Workday && panel.Table.OccasionKind == OccasionKind.Date;
        chainIndex = new int[panel.Occasions];
        chainStart = new int[panel.Persons.Length + 1];
        var known = new List<int>(panel.Occasions);
        var axis = new List<long>(panel.Occasions);
        for (var p = 0; p < panel.Persons.Length; p++)
        {
            chainStart[p] = known.Count;
            for (var o = panel.PersonStart[p]; o < panel.PersonStart[p + 1]; o++)
            {
                var isKnown = !workdays || calendar.IsWorkingDay(panel.Occasion[o]);
                chainIndex[o] = isKnown ? known.Count : None;
                if (!isKnown) continue;
                known.Add(o);
                axis.Add(workdays ? calendar.Number(panel.Occasion[o]) : panel.Occasion[o]);
            }
        }

        chainStart[^1] = known.Count;
        chain = [.. known];
        chainAxis = [.. axis];
    }

    /// <summary>The rule; null when the study states none.</summary>
    public PreviousRule? Rule => history.Previous;

    /// <summary>Whether the rule's calendar knows the occasion's date; if not, the occasion is nobody's history.</summary>
    public bool IsKnown(int occasion) => chainIndex[occasion] != None;

    /// <summary>Number of recorded occasions of the person before this one (0 at the first); only for known occasions.</summary>
    public int Earlier(int occasion) => chainIndex[occasion] - chainStart[panel.PersonOf[occasion]];

    /// <summary>The person's first recorded occasion, for a known occasion of that person.</summary>
    public int FirstOf(int occasion) => chain[chainStart[panel.PersonOf[occasion]]];

    /// <summary>The occasion recorded just before, whatever the gap; <see cref="None"/> at the first.</summary>
    public int JustBefore(int occasion) => Earlier(occasion) > 0 ? chain[chainIndex[occasion] - 1] : None;

    /// <summary>For each occasion the one k steps back by the study's rule, or <see cref="None"/>.</summary>
    public int[] Back(int k) => Shift(-k);

    /// <summary>For each occasion the one k steps ahead by the study's rule, or <see cref="None"/>.</summary>
    public int[] Ahead(int k) => Shift(k);

    private int[] Shift(int by)
    {
        if (shifts.TryGetValue(by, out var cached)) return cached;
        var shifted = new int[panel.Occasions];
        for (var o = 0; o < shifted.Length; o++)
            shifted[o] = !IsKnown(o) ? None : Rule is null or PreviousRule.Recorded ? ByRecord(o, by) : ByDistance(o, by);
        return shifts[by] = shifted;
    }

    private int ByRecord(int occasion, int by)
    {
        var person = panel.PersonOf[occasion];
        var index = (long)chainIndex[occasion] + by;
        if (index < chainStart[person] || index >= chainStart[person + 1]) return None;
        var found = chain[index];
        var isTooFarBack = by < 0 && history.LongestGap is { } longest && panel.Occasion[occasion] - panel.Occasion[found] > longest;
        return isTooFarBack ? None : found;
    }

    private int ByDistance(int occasion, int by)
    {
        var person = panel.PersonOf[occasion];
        var target = chainAxis[chainIndex[occasion]] + ((long)by * (Rule == PreviousRule.Week ? 7 : 1));
        var index = Array.BinarySearch(chainAxis, chainStart[person], chainStart[person + 1] - chainStart[person], target);
        return index >= 0 ? chain[index] : None;
    }
}
