using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>What must be known about the values of a planned term over the whole sample, gathered part by part.</summary>
/// <param name="study">The study.</param>
/// <param name="term">The term.</param>
internal sealed class TermBook(StudySpecification study, PlannedTerm term)
{
    // How often a used occasion has how many occasions before it; few numbers, however long the panel is.
    private readonly SortedDictionary<int, int> earlier = [];

    /// <summary>The term.</summary>
    public PlannedTerm Term => term;

    /// <summary>Used occasions in which the term lacks a value.</summary>
    public int Lacking { get; set; }

    /// <summary>Whether all offered alternatives had the same value in every used occasion so far.</summary>
    public bool IsSameForAll { get; set; } = true;

    /// <summary>Whether any value was not 0.</summary>
    public bool HasValue { get; set; }

    /// <summary>Whether the term is one of the indicators of a text column, and that value does not occur in the sample.</summary>
    public bool IsAbsentLevel => term.IsOneOfLevels && !HasValue;

    /// <summary>Counts a used occasion by the number of recorded occasions before it.</summary>
    public void CountEarlier(int occasions) => earlier[occasions] = earlier.GetValueOrDefault(occasions) + 1;

    /// <summary>What is wrong with the term on this sample, and what the reader should know about it.</summary>
    /// <param name="isForAll">Whether the term enters every alternative, so that a common value cancels.</param>
    /// <param name="problems">Takes what is wrong.</param>
    /// <param name="cautions">Takes the rest.</param>
    public void Report(bool isForAll, List<Problem> problems, List<Caution> cautions)
    {
        if (Lacking > 0) ReportLacking(problems, cautions);
        if (isForAll && IsSameForAll && HasValue) problems.Add(new Problem(
            "term.same_for_all", study.File,
            $"term '{term.Name}' has the same value for all alternatives in every used occasion, so that it cancels out of every comparison",
            term.Specification.Each ? "name the alternative to compare with by base = \"...\"" : "give it each = true and base = \"...\"")
        {
            Line = term.Specification.Line,
        });
        if (IsAbsentLevel)
            cautions.Add(new Caution("term.level_absent", $"'{term.Name}' has no coefficient, because that value does not occur in the estimation sample."));
    }

    /// <summary>How much of a habit stock's start value is left in the sample; null for a term that is no stock.</summary>
    public StockStart? StockStart()
    {
        if (term.Specification.Source is not StockSource stock) return null;
        var occasions = earlier.Values.Sum();
        // The weight falls with the number of earlier occasions: the largest belongs to the smallest number.
        var (low, high) = (Weight((occasions - 1) / 2), Weight(occasions / 2));
        return new StockStart(term.Name, Weight(0), occasions % 2 == 1 ? low : (low + high) / 2);

        double Weight(int place)
        {
            foreach (var (before, count) in earlier)
            {
                if (place < count) return Math.Pow(stock.Retention, before);
                place -= count;
            }

            throw new InvalidOperationException("The sample is empty.");
        }
    }

    private void ReportLacking(List<Problem> problems, List<Caution> cautions)
    {
        var source = term.Specification.Source;
        if (source is ColumnSource { Moment: PersonMean })
            cautions.Add(new Caution("mean.missing", string.Create(
                CultureInfo.InvariantCulture,
                $"In {Lacking} used occasions an alternative has no mean for '{term.Name}', because the person was offered it only at the first recorded occasion; 0 stands there.")));
        else if (study.History.WithoutHistory == MissingHistory.Drop || !TermDirection.LooksBack(source))
            problems.Add(new Problem(
                "term.value_missing", study.File, string.Create(CultureInfo.InvariantCulture, $"term '{term.Name}' has no value in {Lacking} used occasions"),
                "use occasions on which it has one")
            {
                Line = term.Specification.Line,
            });
        else if (TermDirection.Role(source) == CovariateRole.PastConditions)
            cautions.Add(new Caution("history.zero_filled", string.Create(
                CultureInfo.InvariantCulture,
                $"In {Lacking} used occasions '{term.Name}' has no history and counts as 0 (without_history = \"zero\"); a past value of 0 is not the same as an unknown one.")));
    }
}
