using System.Collections.Immutable;
using System.Globalization;
using System.Runtime.InteropServices;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>Fills the covariates of planned terms on a decided sample, and says what the reader should know about them.</summary>
internal sealed class CovariateFiller(
    StudySpecification study, ChoicePanel panel, OccasionHistory history, TermValues values, ImmutableArray<TermSpecification> terms, ImmutableArray<int> used)
{
    private readonly List<Problem> problems = [];
    private readonly List<Caution> cautions = [];
    private readonly int alternatives = panel.Alternatives.Length;

    /// <summary>The covariate set, or the problems that only show once the values are there.</summary>
    public Checked<CovariateSet> Fill(ImmutableArray<PlannedTerm> planned, ImmutableArray<LeftOut> leftOut)
    {
        if (RecordedGaps.Find(panel, history, study.History, terms, used) is { } gaps) cautions.Add(gaps);
        var covariates = ImmutableArray.CreateBuilder<Covariate>();
        var stocks = ImmutableArray.CreateBuilder<StockStart>();
        foreach (var term in planned)
        {
            var made = Make(term);
            if (term.IsOneOfLevels && made.All(c => c.Values.AsSpan().IndexOfAnyExcept(0.0) < 0))
            {
                cautions.Add(new Caution("term.level_absent", $"'{term.Name}' has no coefficient, because that value does not occur in the estimation sample."));
                continue;
            }

            covariates.AddRange(made);
            if (term.Specification.Source is StockSource stock) stocks.Add(Start(term.Name, stock));
        }

        return problems.Count > 0
            ? Checked<CovariateSet>.Bad([.. problems])
            : Checked<CovariateSet>.Good(new CovariateSet(
                panel, used, covariates.DrainToImmutable(), leftOut, stocks.DrainToImmutable(), [.. cautions]));
    }

    private List<Covariate> Make(PlannedTerm term)
    {
        var value = term.Specification.Source is ColumnSource { Moment: PersonMean } ? values.MeanOf(term, MeanOccasions()) : values.Of(term);
        var lacks = new bool[used.Length];
        var made = new List<Covariate>();
        if (term.Specification.Each)
            foreach (var j in term.Applies) made.Add(Make(term, panel.Alternatives[j], [j], value, lacks));
        else
            made.Add(Make(term, null, term.Applies, value, lacks));
        ReportLacking(term, lacks.Count(l => l));
        if (term.Applies.Length == alternatives && CancelsEverywhere(made)) ReportWithoutMeaning(term);
        return made;
    }

    private Covariate Make(PlannedTerm term, string? alternative, ImmutableArray<int> enters, TermValue value, bool[] lacks)
    {
        var s = term.Specification;
        var isConstant = s is { Source: ConstantSource, Times: null, Scale: 1 };
        var filled = isConstant ? [] : Fill(enters, value, s.Times is { } times ? values.Columns.Of(times) : null, s.Scale, lacks);
        return new Covariate(
            term.Name, alternative, enters, ImmutableCollectionsMarshal.AsImmutableArray(filled), isConstant,
            TermDirection.Role(s.Source), s.Fixed, s.Start, term.Index);
    }

    private double[] Fill(ImmutableArray<int> enters, TermValue value, double[]? times, double scale, bool[] lacks)
    {
        var offered = panel.Offered.AsSpan();
        var filled = new double[checked(used.Length * enters.Length)];
        var at = 0;
        for (var t = 0; t < used.Length; t++)
            foreach (var j in enters)
            {
                var cell = (used[t] * alternatives) + j;
                if (offered[cell])
                {
                    var x = value.At(used[t], j) * (times is null ? 1 : times[cell]) * scale;
                    if (double.IsNaN(x)) lacks[t] = true;
                    else filled[at] = x;
                }

                at++;
            }

        return filled;
    }

    /// <summary>
    /// Means are taken over the sample; a first recorded occasion is never in them once a term of the study looks back
    /// (Rabe-Hesketh and Skrondal 2013), even where <c>zero</c> keeps it in the sample.
    /// </summary>
    private IEnumerable<int> MeanOccasions()
    {
        var withoutFirst = TermDirection.AnyLooksBack(study.Terms) || TermDirection.AnyLooksBack(terms);
        return used.Where(o => !withoutFirst || !history.IsKnown(o) || history.Earlier(o) > 0);
    }

    private void ReportLacking(PlannedTerm term, int occasions)
    {
        if (occasions == 0) return;
        var source = term.Specification.Source;
        if (source is ColumnSource { Moment: PersonMean })
            cautions.Add(new Caution("mean.missing", string.Create(
                CultureInfo.InvariantCulture,
                $"In {occasions} used occasions an alternative has no mean for '{term.Name}', because the person was offered it only at the first recorded occasion; 0 stands there.")));
        else if (study.History.WithoutHistory == MissingHistory.Drop || !TermDirection.LooksBack(source))
            problems.Add(new Problem(
                "term.value_missing", study.File, string.Create(CultureInfo.InvariantCulture, $"term '{term.Name}' has no value in {occasions} used occasions"),
                "use occasions on which it has one")
            {
                Line = term.Specification.Line,
            });
        else if (TermDirection.Role(source) == CovariateRole.PastConditions)
            cautions.Add(new Caution("history.zero_filled", string.Create(
                CultureInfo.InvariantCulture,
                $"In {occasions} used occasions '{term.Name}' has no history and counts as 0 (without_history = \"zero\"); a past value of 0 is not the same as an unknown one.")));
    }

    /// <summary>Whether the covariates give every offered alternative the same value in every used occasion, and not simply 0.</summary>
    private bool CancelsEverywhere(List<Covariate> made)
    {
        var offered = panel.Offered.AsSpan();
        var anything = false;
        for (var t = 0; t < used.Length; t++)
        {
            var first = double.NaN;
            for (var j = 0; j < alternatives; j++)
            {
                if (!offered[(used[t] * alternatives) + j]) continue;
                var x = made.Count == 1 ? Value(made[0], (t * alternatives) + j) : Value(made[j], t);
                anything |= x != 0;
                if (double.IsNaN(first)) first = x;
                else if (x != first) return false;
            }
        }

        return anything;
    }

    private static double Value(Covariate covariate, int at) => covariate.IsConstant ? 1 : covariate.Values[at];

    private void ReportWithoutMeaning(PlannedTerm term) => problems.Add(new Problem(
        "term.same_for_all", study.File,
        $"term '{term.Name}' has the same value for all alternatives in every used occasion, so that it cancels out of every comparison",
        term.Specification.Each ? "name the alternative to compare with by base = \"...\"" : "give it each = true and base = \"...\"")
    {
        Line = term.Specification.Line,
    });

    private StockStart Start(string name, StockSource stock)
    {
        var weights = used.Select(o => Math.Pow(stock.Retention, history.Earlier(o))).Order().ToArray();
        var middle = weights.Length / 2;
        return new StockStart(name, weights[^1], weights.Length % 2 == 1 ? weights[middle] : (weights[middle - 1] + weights[middle]) / 2);
    }
}
