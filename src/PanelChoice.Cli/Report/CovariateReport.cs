using PanelChoice.Covariates;
using PanelChoice.Findings;
using PanelChoice.Results;
using PanelChoice.Study;

namespace PanelChoice.Cli.Report;

/// <summary>What the covariates look like: the sample they stand on, and the spread of each.</summary>
internal static class CovariateReport
{
    /// <summary>Puts the report together.</summary>
    /// <param name="study">The study.</param>
    /// <param name="covariates">Its covariates.</param>
    public static Letter Of(StudySpecification study, CovariateSet covariates)
    {
        var letter = new Letter()
            .Title(study.Title.Length > 0 ? study.Title : Path.GetFileName(study.File))
            .Subtitle($"study {Path.GetFileName(study.File)}, data {study.Panel.File}");
        letter.Heading("Who is in it");
        SampleSection.AddTo(letter, SampleSummary.Of(EstimationSample.Of(covariates)));
        foreach (var caution in covariates.Cautions) letter.Gap().Paragraph(caution.Sentence);
        letter.Heading("The covariates, where their alternative is offered");
        letter.Table(
            [
                new TableColumnPlan("term", IsNumber: false), new TableColumnPlan("smallest"), new TableColumnPlan("mean"), new TableColumnPlan("largest"),
                new TableColumnPlan("not 0"),
            ],
            covariates.Covariates.Select(c => Row(c, covariates)));
        return letter;
    }

    private static string[] Row(Covariate covariate, CovariateSet covariates)
    {
        var values = Offered(covariate, covariates).ToList();
        if (values.Count == 0) return [covariate.Label, "never", "", "", ""];
        var mean = values.Average();
        // The digits of the spread: a mean is shown as finely as one person's value would matter.
        var decimals = Math.Min(4, PlainNumber.Decimals(mean, Math.Max(values.Max() - values.Min(), Math.Abs(mean) / 10)));
        return
        [
            covariate.Label, PlainNumber.Text(values.Min(), decimals), PlainNumber.Text(mean, decimals), PlainNumber.Text(values.Max(), decimals),
            PlainNumber.Percent((double)values.Count(v => v != 0) / values.Count),
        ];
    }

    private static IEnumerable<double> Offered(Covariate covariate, CovariateSet covariates)
    {
        var alternatives = covariates.Panel.Alternatives.Length;
        for (var t = 0; t < covariates.Used.Length; t++)
            for (var a = 0; a < covariate.Enters.Length; a++)
                if (covariates.Panel.Offered[(covariates.Used[t] * alternatives) + covariate.Enters[a]])
                    yield return covariate.IsConstant ? 1 : covariate.Values[(t * covariate.Enters.Length) + a];
    }
}
