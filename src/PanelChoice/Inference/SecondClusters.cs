using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Estimation;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>The second grouping of two-way clustering, and how to add the scores up by it.</summary>
/// <param name="By">What a group is: "occasion", "person", or the column.</param>
/// <param name="Refusal">Why nothing may be said by these groups; null when it may.</param>
/// <param name="Sums">Makes the sums on a number of threads, given the sum of s_it s_it' over contributions; called only where there is a maximum and no refusal.</param>
public sealed record SecondClusters(string By, string? Refusal, Func<int, ImmutableArray<double>, SecondSums> Sums)
{
    /// <summary>The second grouping that a study asks for; null where it asks for none.</summary>
    /// <param name="study">The study.</param>
    /// <param name="sample">The sample.</param>
    /// <param name="model">The model fitted to it.</param>
    internal static SecondClusters? Of(StudySpecification study, EstimationSample sample, FittedModel model)
    {
        if (SecondGrouping.Of(study) is not { } grouping) return null;
        var refusal = grouping.Kind != SecondGroupingKind.Occasion || sample.SharesCalendar(study) ? null
            : study.Panel.SharedCalendar is null
                ? "The study does not say whether an occasion is the same day for everybody; where it is, write shared_calendar = true in [panel]."
                : "The study says that an occasion is not the same day for everybody (shared_calendar = false).";
        Func<int, long> groupOf = grouping.Kind switch
        {
            SecondGroupingKind.Occasion => s => sample.Times.Occasion[s],
            SecondGroupingKind.Person => s => model.Design.PersonOf[s],
            _ => s => sample.SecondCluster![s],
        };
        return new SecondClusters(grouping.By, refusal, new ScoreGroups(model, groupOf).Sums);
    }
}

/// <summary>Sums of outer products of scores by the second grouping, and by the pair of both groupings. F free parameters.</summary>
/// <param name="Groups">Number of groups of the second grouping that hold a contribution.</param>
/// <param name="Pairs">Number of pairs of a cluster and a group of the second grouping that hold a contribution.</param>
/// <param name="ByGroup">F x F: sum of s_h s_h' over the groups h, s_h the sum of a group's scores; row by row.</param>
/// <param name="ByPair">F x F: the same over the pairs.</param>
public sealed record SecondSums(int Groups, int Pairs, ImmutableArray<double> ByGroup, ImmutableArray<double> ByPair);
