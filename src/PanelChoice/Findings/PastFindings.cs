using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Study;

namespace PanelChoice.Findings;

/// <summary>What the past does: habit and yesterday's conditions, term by term and in words.</summary>
internal static class PastFindings
{
    public static IEnumerable<Finding> Of(FindingsInput input)
    {
        var looksBack = input.Layout.Parameters.Take(input.Layout.Coefficients).Any(p => p.Role != CovariateRole.Present);
        if (!looksBack)
        {
            yield return new Finding(
                "past.none", FindingTopic.Past, FindingSeverity.Information,
                "No term looks back, so the model says nothing about habit or about yesterday's conditions.", []);
            yield break;
        }

        if (!input.HasErrors) yield break;
        foreach (var term in Enumerable.Range(0, input.Layout.Coefficients)
            .Where(k => input.Layout.Parameters[k].Role != CovariateRole.Present)
            .GroupBy(k => input.Sample.Covariates[k].TermIndex))
            yield return TermFinding(input, [.. term]);

        if (Jointly(input) is { } joint) yield return joint;
        if (input.Layout.Parameters.Any(p => p.Role == CovariateRole.PastChoice) && input.Layout.Parameters.All(p => p.Role != CovariateRole.TasteProxy))
            yield return new Finding(
                "past.taste_in_habit", FindingTopic.Past, FindingSeverity.Notice,
                // Simulated for this project: without true habit, lasting tastes of standard deviation 1 give a last-choice coefficient of 0.57;
                // the running past share of each alternative removes 86 to 97 percent of it.
                "A habit coefficient also collects lasting taste that the model does not hold: people who always prefer one alternative look as "
                + "if they were held by habit. Adding a term with past_share = true shows how much of it that could be.", []);
    }

    private static Finding TermFinding(FindingsInput input, ImmutableArray<int> parameters)
    {
        var first = input.Layout.Parameters[parameters[0]];
        var source = input.Study.Terms[input.Sample.Covariates[parameters[0]].TermIndex].Source;
        var free = parameters.Where(k => input.Layout.Parameters[k].IsFree).ToImmutableArray();
        var figures = parameters.SelectMany(k => input.FiguresOf(k)).ToImmutableArray();
        var id = first.Role switch
        {
            CovariateRole.PastChoice => "past.habit",
            CovariateRole.PastConditions => "past.conditions",
            _ => "past.taste",
        };
        var values = string.Join(", ", parameters.Select(k =>
            (input.Layout.Parameters[k].Alternative is { } a ? a + " " : "") + input.WithInterval(k) + (input.Layout.Parameters[k].IsFree ? "" : " (fixed)")));
        var sentence = $"'{first.Name}', {Meaning(source)}: {values}. {Direction(input, first.Role, source, free)}{Odds(input, source, free)}";
        return new Finding(id, FindingTopic.Past, FindingSeverity.Information, sentence.TrimEnd(), figures);
    }

    private static string Meaning(TermSource source) => source switch
    {
        LastChoiceSource s => $"the alternative taken {Ago(s.Back)}",
        LastNestSource s => $"every alternative in the nest of what was taken {Ago(s.Back)}",
        StockSource => "the habit stock of past choices",
        PastShareSource => "the share of earlier occasions on which the alternative was taken",
        FirstChoiceSource => "the alternative taken at the first recorded occasion",
        ColumnSource { Moment: Lag m } s => $"'{s.Column}' of the same alternative {Ago(m.Back)}",
        ColumnSource { Moment: Change m } s => $"the change in '{s.Column}' since the occasion {Ago(m.Back)}",
        ColumnSource { Moment: ChosenThen m } s => $"'{s.Column}' as met on the alternative taken {Ago(m.Back)}",
        _ => "a term that looks back",
    };

    private static string Ago(int back) => back == 1 ? "last time" : $"{back} occasions ago";

    private static string Direction(FindingsInput input, CovariateRole role, TermSource source, ImmutableArray<int> free)
    {
        if (free.IsEmpty) return "It is fixed, not estimated.";
        var above = free.Where(k => input.SideOf(k, 0) > 0).ToList();
        var below = free.Where(k => input.SideOf(k, 0) < 0).ToList();
        var without = free.Where(k => input.Figures(k, input.Quoted)?.Interval is null).ToList();
        var open = free.Where(k => input.SideOf(k, 0) == 0).Except(without).ToList();
        var parts = new List<string>();
        var what = role switch
        {
            CovariateRole.PastConditions => source is ColumnSource { Moment: Change } ? "a rise" : "a higher value then",
            CovariateRole.PastChoice => source is StockSource ? "a larger stock" : "having taken it",
            _ => "a stronger record of it",
        };
        if (above.Count > 0) parts.Add($"{what} makes an alternative more attractive now{Which(above)}");
        if (below.Count > 0) parts.Add($"{what} makes an alternative less attractive now{Which(below)}");
        if (open.Count > 0) parts.Add($"the interval holds 0, so these data do not show which way it works{Which(open)}");
        if (without.Count > 0) parts.Add($"it has no interval, so nothing can be said of which way it works{Which(without)}");
        var text = string.Join("; ", parts);
        var after = role == CovariateRole.TasteProxy ? " It stands for lasting taste rather than for habit." : "";
        return char.ToUpperInvariant(text[0]) + text[1..] + "." + after;

        string Which(List<int> some) => some.Count == free.Length
            ? free.Length > 1 ? " (all of them)" : ""
            : $" ({string.Join(", ", some.Select(k => input.Layout.Parameters[k].Alternative ?? input.Layout.Parameters[k].Label))})";
    }

    // Only where every alternative stands alone under the root does the coefficient multiply the odds against every other alternative.
    private static string Odds(FindingsInput input, TermSource source, ImmutableArray<int> free)
    {
        if (source is not (LastChoiceSource or FirstChoiceSource) || !input.Study.Nests.IsEmpty || free.Length != 1) return "";
        if (input.Figures(free[0], input.Quoted)?.Interval is not { } interval) return "";
        var odds = Math.Exp(input.Model.Parameters[free[0]]);
        return double.IsFinite(odds) && odds < 1e6
            ? $" It multiplies the odds of that alternative by {PlainNumber.Ratio(odds)} ({PlainNumber.Ratio(Math.Exp(interval.Low))} to {PlainNumber.Ratio(Math.Exp(interval.High))})."
            : "";
    }

    /// <summary>Wald test of all habit terms together, with the quoted covariance, as F(q, G - 1): W / q.</summary>
    private static Finding? Jointly(FindingsInput input)
    {
        var inference = input.Inference;
        var habit = input.Layout.Free.Select((parameter, place) => (parameter, place))
            .Where(x => input.Layout.Parameters[x.parameter].Role == CovariateRole.PastChoice).ToList();
        if (habit.Count < 2 || inference.Covariances.GetValueOrDefault(input.Quoted)?.Matrix is not { } matrix) return null;
        var places = habit.Select(x => x.place).ToArray();
        var block = MathNet.Numerics.LinearAlgebra.Matrix<double>.Build.Dense(places.Length, places.Length, (i, j) => matrix[places[i], places[j]]);
        var values = MathNet.Numerics.LinearAlgebra.Vector<double>.Build.Dense([.. habit.Select(x => input.Model.Parameters[x.parameter])]);
        // More terms than clusters less one leave the block singular: then there is no joint test.
        if (places.Length > inference.Clusters.DegreesOfFreedom || block.Rank() < places.Length) return null;
        var statistic = values.DotProduct(block.Solve(values)) / places.Length;
        if (!double.IsFinite(statistic) || statistic < 0) return null;
        var p = 1 - MathNet.Numerics.Distributions.FisherSnedecor.CDF(places.Length, inference.Clusters.DegreesOfFreedom, statistic);
        return new Finding(
            "past.joint", FindingTopic.Past, FindingSeverity.Information,
            $"All {places.Length} habit coefficients together against none: F({places.Length}, {inference.Clusters.DegreesOfFreedom}) = "
            + $"{PlainNumber.Ratio(statistic)}, {PlainNumber.PValueInWords(p)} ({input.QuotedInWords} covariance).",
            [new FindingFigure("F", statistic), new FindingFigure("p", p)]);
    }
}
