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
    private readonly ChoicePanel panel;
    private readonly OccasionHistory history;
    private readonly HistoryWords words;
    private readonly LeftOutBook book;
    private readonly bool[] isLeftOut;
    private int stage;

    private SampleSelection(ChoicePanel panel, OccasionHistory history, HistorySpecification specification, LeftOutBook book)
    {
        this.panel = panel;
        this.history = history;
        this.book = book;
        words = new HistoryWords(specification, panel.Table.OccasionKind);
        isLeftOut = new bool[panel.Occasions];
    }

    /// <summary>Selects the estimation sample of a panel, or of a part of one, for a list of terms.</summary>
    /// <returns>The occasions used, ascending; the others are counted in the book.</returns>
    public static ImmutableArray<int> Select(
        ChoicePanel panel, OccasionHistory history, HistorySpecification specification, ImmutableArray<PlannedTerm> terms, TermValues values, LeftOutBook book)
    {
        var selection = new SampleSelection(panel, history, specification, book);
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
        return [.. Enumerable.Range(0, panel.Occasions).Where(o => !selection.isLeftOut[o])];
    }

    private void LeaveOut(Func<int, bool> applies, string reason)
    {
        var entry = book.Of(stage++, reason);
        for (var o = 0; o < isLeftOut.Length; o++)
            if (!isLeftOut[o] && applies(o)) LeaveOut(o, entry);
    }

    private void LeaveOut(int occasion, LeftOutBook.Entry entry)
    {
        isLeftOut[occasion] = true;
        entry.Occasions++;
    }

    private void LeaveOutMissing(PlannedTerm term, TermValue value)
    {
        var alternatives = panel.Alternatives.Length;
        var offered = panel.Offered.AsSpan();
        var noRecord = book.Of(stage, words.NoRecord(term.Specification.Source));
        var noValue = new LeftOutBook.Entry?[alternatives];
        for (var o = 0; o < isLeftOut.Length; o++)
        {
            if (isLeftOut[o]) continue;
            if (!value.HasRecord(o))
            {
                LeaveOut(o, noRecord);
                continue;
            }

            foreach (var j in term.Applies)
            {
                if (!offered[(o * alternatives) + j] || !double.IsNaN(value.At(o, j))) continue;
                LeaveOut(o, noValue[j] ??= book.Of(stage, words.NoValue((ColumnSource)term.Specification.Source, panel.Alternatives[j])));
                break;
            }
        }

        stage++;
    }
}
