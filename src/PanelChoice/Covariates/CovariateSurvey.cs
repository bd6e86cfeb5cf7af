using System.Collections.Immutable;
using PanelChoice.Data;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>
/// Builds covariates part by part. The first visit plans the terms, checks every value and learns what only the whole sample tells: which text values
/// occur in it, what cancels, what is missing. A later visit fills the covariates that stay. A panel in memory is one part, visited once.
/// </summary>
/// <param name="study">The study.</param>
/// <param name="terms">The terms to fill, which need not be the study's.</param>
internal sealed class CovariateSurvey(StudySpecification study, ImmutableArray<TermSpecification> terms)
{
    private readonly List<Problem> problems = [];
    private readonly LogarithmCheck logarithms = new();
    private readonly RecordedGaps gaps = new(study.History, terms);
    private ImmutableArray<TermBook> books;
    private ImmutableArray<Covariate> heads = [];
    private int alternatives;

    /// <summary>All planned covariates, without values, once a part was filled.</summary>
    public ImmutableArray<Covariate> Planned => heads;

    /// <summary>What is wrong so far.</summary>
    public ImmutableArray<Problem> Problems => [.. problems, .. logarithms.Problems];

    /// <summary>Plans the terms at the first part and checks the logarithms of every part.</summary>
    /// <returns>Whether nothing is wrong so far; otherwise no values can be made.</returns>
    public bool Plan(ChoicePanel part)
    {
        if (books.IsDefault)
        {
            alternatives = part.Alternatives.Length;
            CheckRule(part.Table.OccasionKind);
            books = [.. new TermPlanner(study, part, problems).Plan(terms).Select(t => new TermBook(study, t))];
        }

        logarithms.Add(part, books.Select(b => b.Term));
        return problems.Count == 0 && logarithms.IsEmpty;
    }

    /// <summary>Notes a problem of another kind.</summary>
    public void Reject(Problem problem) => problems.Add(problem);

    /// <summary>Fills all planned covariates of a part and learns from them; those that do not stay are among them.</summary>
    public CovariateSet Add(SamplePart part)
    {
        gaps.Observe(part.Panel);
        return Fill(part, (filler, book) => filler.Fill(book.Term, book));
    }

    /// <summary>Counts what looks back across gaps in a part, once all parts were added.</summary>
    public void CountGaps(SamplePart part) => gaps.Count(part);

    /// <summary>Fills a part's covariates again, once the first visit is over.</summary>
    public CovariateSet Fill(SamplePart part) => Fill(part, (filler, book) => book.IsAbsentLevel ? [] : filler.Fill(book.Term, null));

    /// <summary>What the whole sample tells, once all parts were added; its cautions about gaps are complete once these were counted.</summary>
    /// <param name="leftOut">What is not in the sample.</param>
    public Checked<CovariateOutline> Finish(ImmutableArray<LeftOut> leftOut)
    {
        List<Problem> wrong = [.. Problems];
        List<Caution> cautions = [];
        if (gaps.Caution() is { } gap) cautions.Add(gap);
        foreach (var book in books) book.Report(book.Term.Applies.Length == alternatives, wrong, cautions);
        if (wrong.Count > 0) return Checked<CovariateOutline>.Bad([.. wrong]);
        var absent = books.Where(b => b.IsAbsentLevel).Select(b => b.Term.Name).ToImmutableHashSet(StringComparer.Ordinal);
        return Checked<CovariateOutline>.Good(new CovariateOutline(
            [.. heads.Where(h => !absent.Contains(h.Term))], absent, leftOut, [.. books.Select(b => b.StockStart()).OfType<StockStart>()], [.. cautions]));
    }

    private CovariateSet Fill(SamplePart part, Func<CovariateFiller, TermBook, List<Covariate>> fill)
    {
        var filler = new CovariateFiller(study, part, terms);
        ImmutableArray<Covariate> made = [.. books.SelectMany(b => fill(filler, b))];
        if (heads.IsEmpty) heads = [.. made.Select(c => c with { Values = [] })];
        return new CovariateSet(part.Panel, part.Used, made, [], [], []);
    }

    private void CheckRule(OccasionKind kind)
    {
        var needsRule = terms.FirstOrDefault(t => TermDirection.StepsBack(t.Source) is not null || TermDirection.StepsAhead(t.Source) is not null);
        if (study.History.Previous is null && needsRule is not null)
            problems.Add(new Problem(
                "study.no_previous", study.File, $"term '{needsRule.Name}' looks at another occasion, and [history] does not say which is the previous one",
                "state previous = \"recorded\", \"step\", \"day\", \"workday\" or \"week\"")
            {
                Line = needsRule.Line,
            });
        var pairs = (study.History.Previous, kind) switch
        {
            (PreviousRule.Step, OccasionKind.Date) => "counts whole numbers, and the occasions are dates",
            (PreviousRule.Day or PreviousRule.Workday or PreviousRule.Week, OccasionKind.WholeNumber) => "counts dates, and the occasions are whole numbers",
            _ => null,
        };
        if (pairs is null) return;
        var rule = study.History.Previous.ToString()!.ToLowerInvariant();
        var remedy = kind == OccasionKind.Date ? "use \"recorded\", \"day\", \"workday\" or \"week\"" : "use \"recorded\" or \"step\"";
        problems.Add(new Problem("study.previous_does_not_fit", study.File, $"previous = \"{rule}\" {pairs}", remedy));
    }
}
