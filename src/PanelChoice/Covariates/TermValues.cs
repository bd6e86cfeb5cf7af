using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>Gives each planned term its values over the recorded panel.</summary>
internal sealed class TermValues(ChoicePanel panel, NestTree tree, OccasionHistory history)
{
    private readonly Dictionary<PlannedTerm, TermValue> made = new(ReferenceEqualityComparer.Instance);

    /// <summary>The columns over the panel's cells.</summary>
    public ColumnCells Columns { get; } = new(panel);

    /// <summary>The values of a term other than a person mean, which needs the estimation sample.</summary>
    public TermValue Of(PlannedTerm term) => made.TryGetValue(term, out var value) ? value : made[term] = Make(term);

    /// <summary>The values of a term that is a person mean.</summary>
    /// <param name="term">The term.</param>
    /// <param name="occasions">The occasions to take means over.</param>
    public TermValue MeanOf(PlannedTerm term, IEnumerable<int> occasions) =>
        PersonMeanValue.Over(Cells((ColumnSource)term.Specification.Source, term), panel, occasions);

    private double[] Cells(ColumnSource source, PlannedTerm term) => Columns.Of(source.Column, term.Specification.Log, term.Level);

    private TermValue Make(PlannedTerm term)
    {
        var alternatives = panel.Alternatives.Length;
        return term.Specification.Source switch
        {
            ConstantSource => new ConstantValue(),
            LastChoiceSource s => new LastChoiceValue(panel, history.Back(s.Back)),
            LastNestSource s => new LastNestValue(panel, tree, history.Back(s.Back)),
            StockSource s => new StockValue(panel, history, s.Retention),
            PastShareSource => new PastShareValue(panel, history),
            FirstChoiceSource => new FirstChoiceValue(panel, history),
            ColumnSource s => s.Moment switch
            {
                Now => new PresentValue(Cells(s, term), alternatives),
                Lag m => new ShiftedValue(Cells(s, term), alternatives, history.Back(m.Back)),
                Lead m => new ShiftedValue(Cells(s, term), alternatives, history.Ahead(m.Ahead)),
                Change m => new ChangeValue(Cells(s, term), alternatives, history.Back(m.Back)),
                ChosenThen m => new ChosenThenValue(Cells(s, term), panel, history.Back(m.Back)),
                _ => throw new ArgumentException($"No values for {s.Moment}.", nameof(term)),
            },
            var other => throw new ArgumentException($"No values for {other}.", nameof(term)),
        };
    }
}
