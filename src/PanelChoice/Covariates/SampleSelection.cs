using System.Collections.Immutable;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>
/// Decides which recorded occasions are used, and gives every other one exactly one reason. The reasons are tried in this order: the date is
/// outside the rule's calendar; only one alternative is offered; the person's first recorded occasion; no history; no future. Means by person
/// are taken over the sample and therefore never decide about it. A missing future is never filled with 0: <c>without_history</c> speaks of the past.
/// </summary>
internal sealed class SampleSelection
{
    private const int Used = -1;

    private readonly ChoicePanel panel;
    private readonly OccasionHistory history;
    private readonly HistoryWords words;
    private readonly int[] reasonOf;
    private readonly List<string> reasons = [];

    private SampleSelection(ChoicePanel panel, OccasionHistory history, HistorySpecification specification)
    {
        this.panel = panel;
        this.history = history;
        words = new HistoryWords(specification, panel.Table.OccasionKind);
        reasonOf = new int[panel.Occasions];
        Array.Fill(reasonOf, Used);
    }

    /// <summary>Selects the estimation sample for a list of terms.</summary>
    public static (ImmutableArray<int> Used, ImmutableArray<LeftOut> LeftOut) Select(
        ChoicePanel panel, OccasionHistory history, HistorySpecification specification, ImmutableArray<PlannedTerm> terms, TermValues values)
    {
        var selection = new SampleSelection(panel, history, specification);
        selection.LeaveOut(o => !history.IsKnown(o), HistoryWords.OutsideCalendar);
        selection.LeaveOut(o => panel.OfferedAt(o) < 2, HistoryWords.OneAlternative);
        if (specification.WithoutHistory == MissingHistory.Drop)
        {
            var lookingBack = terms.Where(t => TermDirection.LooksBack(t.Specification.Source)).ToList();
            if (lookingBack.Count > 0) selection.LeaveOut(o => history.Earlier(o) == 0, HistoryWords.FirstOccasion);
            foreach (var term in lookingBack) selection.LeaveOutMissing(term, values.Of(term));
        }

        foreach (var term in terms.Where(t => TermDirection.StepsAhead(t.Specification.Source) is not null))
            selection.LeaveOutMissing(term, values.Of(term));
        return selection.Outcome();
    }

    private void LeaveOut(Func<int, bool> applies, string reason)
    {
        var number = NumberOf(reason);
        for (var o = 0; o < reasonOf.Length; o++)
            if (reasonOf[o] == Used && applies(o)) reasonOf[o] = number;
    }

    private void LeaveOutMissing(PlannedTerm term, TermValue value)
    {
        var alternatives = panel.Alternatives.Length;
        var offered = panel.Offered.AsSpan();
        var noRecord = NumberOf(words.NoRecord(term.Specification.Source));
        var noValue = new int[alternatives];
        Array.Fill(noValue, Used);
        for (var o = 0; o < reasonOf.Length; o++)
        {
            if (reasonOf[o] != Used) continue;
            if (!value.HasRecord(o))
            {
                reasonOf[o] = noRecord;
                continue;
            }

            foreach (var j in term.Applies)
            {
                if (!offered[(o * alternatives) + j] || !double.IsNaN(value.At(o, j))) continue;
                if (noValue[j] == Used) noValue[j] = NumberOf(words.NoValue((ColumnSource)term.Specification.Source, panel.Alternatives[j]));
                reasonOf[o] = noValue[j];
                break;
            }
        }
    }

    private int NumberOf(string reason)
    {
        var index = reasons.IndexOf(reason);
        if (index >= 0) return index;
        reasons.Add(reason);
        return reasons.Count - 1;
    }

    private (ImmutableArray<int> Used, ImmutableArray<LeftOut> LeftOut) Outcome()
    {
        var counts = new int[reasons.Count];
        var used = ImmutableArray.CreateBuilder<int>();
        for (var o = 0; o < reasonOf.Length; o++)
            if (reasonOf[o] == Used) used.Add(o);
            else counts[reasonOf[o]]++;
        return (used.DrainToImmutable(), [.. reasons.Select((r, i) => new LeftOut(r, counts[i])).Where(l => l.Occasions > 0)]);
    }
}
