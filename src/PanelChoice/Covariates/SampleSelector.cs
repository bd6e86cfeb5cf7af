using System.Collections.Immutable;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Covariates;

/// <summary>Selects the estimation sample of a study part by part. What a part's sample is depends on its persons alone.</summary>
/// <param name="study">The study.</param>
/// <param name="tree">The nest tree over the panel's alternatives.</param>
internal sealed class SampleSelector(StudySpecification study, NestTree tree)
{
    private ImmutableArray<PlannedTerm> planned;

    /// <summary>Selects the sample of a part.</summary>
    /// <param name="part">The part.</param>
    /// <param name="book">Counts what is left out; null where it was counted at an earlier visit.</param>
    /// <returns>The part with its sample; null where the study's terms do not fit the data.</returns>
    public SamplePart? Select(ChoicePanel part, LeftOutBook? book)
    {
        if (planned.IsDefault)
        {
            var problems = new List<Problem>();
            planned = new TermPlanner(study, part, problems).Plan(study.Terms);
            if (problems.Count > 0) planned = [];
        }

        if (planned.IsEmpty) return null;
        var history = new OccasionHistory(part, study.History);
        var values = new TermValues(part, tree, history);
        return new SamplePart(part, history, values, SampleSelection.Select(part, history, study.History, planned, values, book ?? new LeftOutBook()));
    }
}
