namespace PanelChoice.Findings;

/// <summary>What the covariates say about the sample and about history.</summary>
internal static class SampleFindings
{
    public static IEnumerable<Finding> Of(FindingsInput input)
    {
        foreach (var caution in input.Sample.Cautions)
            yield return new Finding(caution.Id, FindingTopic.Sample, FindingSeverity.Notice, caution.Sentence, []);
        foreach (var stock in input.Sample.StockStarts)
            yield return new Finding(
                "history.stock_start", FindingTopic.Sample, FindingSeverity.Information,
                $"The habit stock '{stock.Term}' starts at one over the number of alternatives; that start still has a weight of "
                + $"{PlainNumber.Percent(stock.WeightAtFirst)} at a person's first used occasion and "
                + $"{PlainNumber.Percent(stock.WeightAtMedian)} at the median one.",
                [new FindingFigure("weight at the first", stock.WeightAtFirst), new FindingFigure("weight at the median", stock.WeightAtMedian)]);
    }
}
