using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Study;

namespace PanelChoice.Design;

/// <summary>A sample and its design.</summary>
/// <param name="Sample">Counts and words.</param>
/// <param name="Design">The design.</param>
internal sealed record DesignedSample(EstimationSample Sample, ChoiceDesign Design);

/// <summary>
/// Builds designs from a panel that is read in parts: one visit learns what only the whole tells, a second one fills blocks as they come. No table, panel
/// or covariate of more than a part is ever in memory, and the bits are those of a panel that is.
/// </summary>
/// <param name="study">The study.</param>
/// <param name="parts">Its panel.</param>
/// <param name="tree">The nest tree over the panel's alternatives.</param>
/// <param name="work">Cancellation.</param>
internal sealed class PartedDesigns(StudySpecification study, PanelParts parts, NestTree tree, WorkContext work)
{
    private readonly SampleSelector selector = new(study, tree);

    /// <summary>Selects the sample and builds the design of the study's terms.</summary>
    /// <param name="target">Where blocks of a format go.</param>
    public Checked<DesignedSample> Main(Func<BlockFormat, IBlockTarget> target)
    {
        var survey = new CovariateSurvey(study, study.Terms);
        var design = new DesignSurvey(tree);
        var sample = new EstimationSample.Builder();
        var leftOut = new LeftOutBook();
        var wrong = parts.Visit((part, firstPerson) =>
        {
            work.Cancellation.ThrowIfCancellationRequested();
            if (!survey.Plan(part)) return;
            var selected = selector.Select(part, leftOut)!;
            sample.Add(part, selected.Used);
            design.Add(survey.Add(selected), FirstCluster(firstPerson));
        });
        if (!wrong.IsEmpty) return Checked<DesignedSample>.Bad(wrong);
        if (!survey.Problems.IsEmpty) return Checked<DesignedSample>.Bad(survey.Problems);
        if (sample.Occasions == 0) return Checked<DesignedSample>.Bad([CovariateBuilder.EmptySample(parts.Outline.File, leftOut.Reasons)]);
        return survey.Finish(leftOut.Reasons)
            .Then(outline => Fill(survey, design, outline, target, countGaps: true))
            .Then(filled => survey.Finish(leftOut.Reasons).Then(outline => Checked<DesignedSample>.Good(
                new DesignedSample(sample.Finish(parts.Outline.File, parts.Outline.Sha256, outline), filled))));
    }

    /// <summary>Builds the design of other terms on the same sample.</summary>
    /// <param name="terms">The terms.</param>
    /// <param name="target">Where blocks of a format go.</param>
    public Checked<ChoiceDesign> Other(ImmutableArray<TermSpecification> terms, Func<BlockFormat, IBlockTarget> target)
    {
        var survey = new CovariateSurvey(study, terms);
        var design = new DesignSurvey(tree);
        var wrong = parts.Visit((part, firstPerson) =>
        {
            work.Cancellation.ThrowIfCancellationRequested();
            if (survey.Plan(part)) design.Add(survey.Add(selector.Select(part, null)!), FirstCluster(firstPerson));
        });
        if (!wrong.IsEmpty) return Checked<ChoiceDesign>.Bad(wrong);
        return survey.Problems.IsEmpty
            ? survey.Finish([]).Then(outline => Fill(survey, design, outline, target, countGaps: false))
            : Checked<ChoiceDesign>.Bad(survey.Problems);
    }

    private int FirstCluster(int firstPerson) => parts.ClustersArePersons ? firstPerson : 0;

    private Checked<ChoiceDesign> Fill(
        CovariateSurvey survey, DesignSurvey design, CovariateOutline outline, Func<BlockFormat, IBlockTarget> open, bool countGaps)
    {
        var plan = DesignPlan.Of(
            design, survey.Planned, outline.Keeps, tree, study.Nests, study.Estimate.Form, study.Inference.Cluster, parts.Clusters);
        var target = open(plan.Format);
        var filler = new DesignFiller(plan, target);
        // A block never takes persons from two parts: a part ends where a block does.
        var ends = plan.BlockEnds();
        var wrong = parts.Visit(
            (part, _) =>
            {
                work.Cancellation.ThrowIfCancellationRequested();
                var selected = selector.Select(part, null)!;
                if (countGaps) survey.CountGaps(selected);
                filler.Add(survey.Fill(selected));
            },
            person => ends.Contains(design.PersonsUpTo[person]));
        return wrong.IsEmpty ? Checked<ChoiceDesign>.Good(plan.On(target.Complete())) : Checked<ChoiceDesign>.Bad(wrong);
    }
}
