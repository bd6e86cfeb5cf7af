using System.Collections.Immutable;
using System.Runtime.InteropServices;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>Fills the covariates of planned terms on the sample of a panel, or of a part of one.</summary>
/// <param name="study">The study.</param>
/// <param name="part">The panel and its sample.</param>
/// <param name="terms">The terms that are filled.</param>
internal sealed class CovariateFiller(StudySpecification study, SamplePart part, ImmutableArray<TermSpecification> terms)
{
    private readonly ChoicePanel panel = part.Panel;
    private readonly ImmutableArray<int> used = part.Used;
    private readonly int alternatives = part.Panel.Alternatives.Length;

    /// <summary>The covariates of a term.</summary>
    /// <param name="book">The term's book, which learns what the values look like; null where it learnt that at an earlier visit.</param>
    /// <param name="term">The term.</param>
    public List<Covariate> Fill(PlannedTerm term, TermBook? book)
    {
        var value = term.Specification.Source is ColumnSource { Moment: PersonMean } ? part.Values.MeanOf(term, MeanOccasions()) : part.Values.Of(term);
        var lacks = new bool[used.Length];
        var made = new List<Covariate>();
        if (term.Specification.Each)
            foreach (var j in term.Applies) made.Add(Make(term, panel.Alternatives[j], [j], value, lacks));
        else
            made.Add(Make(term, null, term.Applies, value, lacks));
        if (book is not null) Note(book, made, lacks);
        return made;
    }

    private void Note(TermBook book, List<Covariate> made, bool[] lacks)
    {
        book.Lacking += lacks.Count(l => l);
        book.HasValue |= made.Exists(c => c.IsConstant || c.Values.AsSpan().IndexOfAnyExcept(0.0) >= 0);
        if (book.Term.Applies.Length == alternatives) book.IsSameForAll = book.IsSameForAll && IsSameForAll(made);
        if (book.Term.Specification.Source is StockSource)
            foreach (var o in used) book.CountEarlier(part.History.Earlier(o));
    }

    private Covariate Make(PlannedTerm term, string? alternative, ImmutableArray<int> enters, TermValue value, bool[] lacks)
    {
        var s = term.Specification;
        var isConstant = s is { Source: ConstantSource, Times: null, Scale: 1 };
        var filled = isConstant ? [] : Fill(enters, value, s.Times is { } times ? part.Values.Columns.Of(times) : null, s.Scale, lacks);
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
        return used.Where(o => !withoutFirst || !part.History.IsKnown(o) || part.History.Earlier(o) > 0);
    }

    /// <summary>Whether the covariates give every offered alternative the same value in every used occasion.</summary>
    private bool IsSameForAll(List<Covariate> made)
    {
        var offered = panel.Offered.AsSpan();
        for (var t = 0; t < used.Length; t++)
        {
            var first = double.NaN;
            for (var j = 0; j < alternatives; j++)
            {
                if (!offered[(used[t] * alternatives) + j]) continue;
                var x = made.Count == 1 ? Value(made[0], (t * alternatives) + j) : Value(made[j], t);
                if (double.IsNaN(first)) first = x;
                else if (x != first) return false;
            }
        }

        return true;
    }

    private static double Value(Covariate covariate, int at) => covariate.IsConstant ? 1 : covariate.Values[at];
}
