using System.Collections.Immutable;

namespace PanelChoice.Findings;

/// <summary>Joins what the stages measured into findings that a reader can use.</summary>
public static class FindingList
{
    /// <summary>All findings, in the order of <see cref="FindingTopic"/> and, inside a topic, in the order to be read.</summary>
    /// <param name="input">What they are drawn from.</param>
    public static ImmutableArray<Finding> Of(FindingsInput input)
    {
        ArgumentNullException.ThrowIfNull(input);
        return
        [
            .. SampleFindings.Of(input),
            .. TrustFindings.Of(input),
            .. PrecisionFindings.Of(input),
            .. PastFindings.Of(input),
            .. NestFindings.Of(input),
            .. IndependenceFindings.Of(input),
            .. AdviceFindings.Of(input),
            .. CautionFindings.Of(input),
        ];
    }
}
