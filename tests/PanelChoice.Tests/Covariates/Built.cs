using System.Globalization;
using PanelChoice.Covariates;
using PanelChoice.Panels;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Covariates;

/// <summary>Builds covariates of hand-written panels and shows them in a form that can be written down beside them.</summary>
internal static class Built
{
    public static CovariateSet Set(ChoicePanel panel, HistorySpecification history, params TermSpecification[] terms)
    {
        var study = Studies.With(history, terms);
        var built = CovariateBuilder.Build(study, panel, SyntheticPanel.TreeOf(panel.Alternatives, study.Nests));
        Assert.Empty(built.Problems.Select(p => p.Sentence));
        var accounted = built.Value!.Used.Length + built.Value.LeftOut.Sum(l => l.Occasions);
        Assert.Equal(panel.Occasions, accounted);
        return built.Value;
    }

    public static IEnumerable<Problem> Problems(ChoicePanel panel, HistorySpecification history, params TermSpecification[] terms)
    {
        var study = Studies.With(history, terms);
        var built = CovariateBuilder.Build(study, panel, SyntheticPanel.TreeOf(panel.Alternatives, study.Nests));
        Assert.Null(built.Value);
        return built.Problems;
    }

    /// <summary>The used occasions as "person occasion", in order.</summary>
    public static string[] Occasions(this CovariateSet set) =>
        [.. set.Used.Select(o => $"{set.Panel.Persons[set.Panel.PersonOf[o]]} {Name(set.Panel, o)}")];

    /// <summary>A covariate, one text for each used occasion: its values in the order of the alternatives it enters.</summary>
    public static string[] Shown(this CovariateSet set, string label)
    {
        var covariate = Assert.Single(set.Covariates, c => c.Label == label);
        var width = covariate.Enters.Length;
        return [.. Enumerable.Range(0, set.Used.Length).Select(t => string.Join(' ', Enumerable.Range(0, width)
            .Select(a => Math.Round(covariate.Values[(t * width) + a], 10).ToString(CultureInfo.InvariantCulture))))];
    }

    /// <summary>The reasons as "number reason".</summary>
    public static string[] Reasons(this CovariateSet set) => [.. set.LeftOut.Select(l => $"{l.Occasions} {l.Reason}")];

    private static string Name(ChoicePanel panel, int occasion) => panel.Table.OccasionKind == PanelChoice.Data.OccasionKind.Date
        ? DateOnly.FromDayNumber((int)panel.Occasion[occasion]).ToString("yyyy-MM-dd", CultureInfo.InvariantCulture)
        : panel.Occasion[occasion].ToString(CultureInfo.InvariantCulture);
}
