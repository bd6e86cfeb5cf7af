using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>
/// A term's value at an occasion and alternative, before <c>times</c> and <c>scale</c>. Not a number means that the alternative has no value
/// to look at (no row then, or an empty cell there). Cells are <c>occasion * J + alternative</c>.
/// </summary>
internal abstract class TermValue
{
    /// <summary>Whether there is an occasion to look at; false when the term looks back to, or ahead at, a record that does not exist.</summary>
    public virtual bool HasRecord(int occasion) => true;

    /// <summary>The value; not a number where it is missing. Only for occasions that the history rule's calendar knows.</summary>
    public abstract double At(int occasion, int alternative);
}

/// <summary>The constant 1.</summary>
internal sealed class ConstantValue : TermValue
{
    public override double At(int occasion, int alternative) => 1;
}

/// <summary>A column at the present occasion.</summary>
internal sealed class PresentValue(double[] cells, int alternatives) : TermValue
{
    public override double At(int occasion, int alternative) => cells[(occasion * alternatives) + alternative];
}

/// <summary>The same alternative's value at another occasion (lag or lead), from its row, whether it was offered then or not.</summary>
internal sealed class ShiftedValue(double[] cells, int alternatives, int[] other) : TermValue
{
    public override bool HasRecord(int occasion) => other[occasion] >= 0;

    public override double At(int occasion, int alternative) =>
        other[occasion] is var then && then >= 0 ? cells[(then * alternatives) + alternative] : double.NaN;
}

/// <summary>The present value minus the lagged one.</summary>
internal sealed class ChangeValue(double[] cells, int alternatives, int[] back) : TermValue
{
    public override bool HasRecord(int occasion) => back[occasion] >= 0;

    public override double At(int occasion, int alternative) => back[occasion] is var then && then >= 0
        ? cells[(occasion * alternatives) + alternative] - cells[(then * alternatives) + alternative]
        : double.NaN;
}

/// <summary>The attribute that the chosen alternative had then, on that alternative; 0 on the others.</summary>
internal sealed class ChosenThenValue(double[] cells, ChoicePanel panel, int[] back) : TermValue
{
    public override bool HasRecord(int occasion) => back[occasion] >= 0;

    public override double At(int occasion, int alternative)
    {
        var then = back[occasion];
        if (then < 0) return double.NaN;
        return panel.Chosen[then] == alternative ? cells[(then * panel.Alternatives.Length) + alternative] : 0;
    }
}

/// <summary>Mean by person and alternative; not a number where the alternative has no occasion to take it over.</summary>
internal sealed class PersonMeanValue(double[] means, ChoicePanel panel) : TermValue
{
    public override double At(int occasion, int alternative) => means[(panel.PersonOf[occasion] * panel.Alternatives.Length) + alternative];

    /// <summary>Unweighted means of a column over the occasions given on which the alternative was offered.</summary>
    /// <param name="cells">The column, transformed.</param>
    /// <param name="panel">The panel.</param>
    /// <param name="occasions">Occasions to take the mean over.</param>
    public static PersonMeanValue Over(double[] cells, ChoicePanel panel, IEnumerable<int> occasions)
    {
        var alternatives = panel.Alternatives.Length;
        var offered = panel.Offered.AsSpan();
        var means = new double[panel.Persons.Length * alternatives];
        var counts = new int[means.Length];
        foreach (var o in occasions)
            for (var j = 0; j < alternatives; j++)
            {
                if (!offered[(o * alternatives) + j]) continue;
                var at = (panel.PersonOf[o] * alternatives) + j;
                means[at] += cells[(o * alternatives) + j];
                counts[at]++;
            }

        for (var i = 0; i < means.Length; i++) means[i] = counts[i] > 0 ? means[i] / counts[i] : double.NaN;
        return new PersonMeanValue(means, panel);
    }
}

/// <summary>1 for the alternative chosen then.</summary>
internal sealed class LastChoiceValue(ChoicePanel panel, int[] back) : TermValue
{
    public override bool HasRecord(int occasion) => back[occasion] >= 0;

    public override double At(int occasion, int alternative) =>
        back[occasion] is var then && then >= 0 ? (panel.Chosen[then] == alternative ? 1 : 0) : double.NaN;
}

/// <summary>1 for every alternative whose own nest (the lowest that lists it, with all below it) holds the choice made then.</summary>
internal sealed class LastNestValue : TermValue
{
    private readonly ChoicePanel panel;
    private readonly int[] back;
    private readonly bool[] holds;

    public LastNestValue(ChoicePanel panel, NestTree tree, int[] back)
    {
        this.panel = panel;
        this.back = back;
        var alternatives = panel.Alternatives.Length;
        holds = new bool[alternatives * alternatives];
        for (var j = 0; j < alternatives; j++)
        {
            holds[(j * alternatives) + j] = true;
            var nest = tree.ParentOf(j);
            if (nest == tree.Root) continue;
            foreach (var other in tree.AlternativesUnder(nest)) holds[(j * alternatives) + other] = true;
        }
    }

    public override bool HasRecord(int occasion) => back[occasion] >= 0;

    public override double At(int occasion, int alternative) => back[occasion] is var then && then >= 0
        ? (holds[(alternative * panel.Alternatives.Length) + panel.Chosen[then]] ? 1 : 0)
        : double.NaN;
}

/// <summary>
/// Habit stock S_j,t = r S_j,t-1 + (1 - r) 1[j chosen at t - 1], started at 1/J, one step for each recorded occasion whatever the gap:
/// exponential smoothing of past choices (Guadagni and Little 1983).
/// </summary>
internal sealed class StockValue : TermValue
{
    private readonly OccasionHistory history;
    private readonly double[] stock;
    private readonly int alternatives;

    public StockValue(ChoicePanel panel, OccasionHistory history, double retention)
    {
        this.history = history;
        alternatives = panel.Alternatives.Length;
        stock = new double[panel.Occasions * alternatives];
        for (var o = 0; o < panel.Occasions; o++)
        {
            if (!history.IsKnown(o)) continue;
            var before = history.JustBefore(o);
            for (var j = 0; j < alternatives; j++)
                stock[(o * alternatives) + j] = before < 0
                    ? 1.0 / alternatives
                    : (retention * stock[(before * alternatives) + j]) + (panel.Chosen[before] == j ? 1 - retention : 0);
        }
    }

    /// <summary>At a person's first recorded occasion the stock is its start value alone.</summary>
    public override bool HasRecord(int occasion) => history.Earlier(occasion) > 0;

    public override double At(int occasion, int alternative) => stock[(occasion * alternatives) + alternative];
}

/// <summary>Share of the person's earlier recorded occasions on which the alternative was chosen.</summary>
internal sealed class PastShareValue : TermValue
{
    private readonly OccasionHistory history;
    private readonly int[] times;
    private readonly int alternatives;

    public PastShareValue(ChoicePanel panel, OccasionHistory history)
    {
        this.history = history;
        alternatives = panel.Alternatives.Length;
        times = new int[panel.Occasions * alternatives];
        for (var o = 0; o < panel.Occasions; o++)
        {
            if (!history.IsKnown(o) || history.JustBefore(o) is not (var before and >= 0)) continue;
            Array.Copy(times, before * alternatives, times, o * alternatives, alternatives);
            times[(o * alternatives) + panel.Chosen[before]]++;
        }
    }

    public override bool HasRecord(int occasion) => history.Earlier(occasion) > 0;

    public override double At(int occasion, int alternative) =>
        HasRecord(occasion) ? times[(occasion * alternatives) + alternative] / (double)history.Earlier(occasion) : double.NaN;
}

/// <summary>1 for the alternative chosen at the person's first recorded occasion; that occasion itself has no value, it would be the answer.</summary>
internal sealed class FirstChoiceValue(ChoicePanel panel, OccasionHistory history) : TermValue
{
    public override bool HasRecord(int occasion) => history.Earlier(occasion) > 0;

    public override double At(int occasion, int alternative) =>
        HasRecord(occasion) ? (panel.Chosen[history.FirstOf(occasion)] == alternative ? 1 : 0) : double.NaN;
}
