using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Results;
using PanelChoice.Study;

namespace PanelChoice;

/// <summary>The run, told once: from a study to its result.</summary>
public static class PanelAnalysis
{
    /// <summary>The main job: reads and checks the panel, builds covariates, fits, computes standard errors, tests independence, says what it found.</summary>
    /// <param name="study">The study.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <returns>The result, or every problem found with the data.</returns>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static Checked<AnalysisResult> Run(StudySpecification study, WorkContext work) =>
        Run(study, PanelAnalysisSample.Read(study, work), work);

    /// <summary>The main job on a sample that was read already; it is let go of at the end.</summary>
    /// <param name="study">The study.</param>
    /// <param name="read">The sample, or the problems that kept it from being made.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <returns>The result, or the problems; <c>store.unreadable</c> where the sample's store cannot be read to the end.</returns>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static Checked<AnalysisResult> Run(StudySpecification study, Checked<PanelAnalysisSample> read, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(read);
        return read.Then(sample =>
        {
            using (sample) return sample.Estimate(() => Checked<AnalysisResult>.Good(Conclude(Fit(study, sample, work), work)));
        });
    }

    /// <summary>Reads and checks the data and builds the covariates, all in memory, for who wants to see them.</summary>
    /// <param name="study">The study.</param>
    /// <param name="work">Progress and cancellation.</param>
    /// <returns>The panel and its covariates, or every problem found.</returns>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static Checked<PanelAnalysisInput> Prepare(StudySpecification study, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(work);
        work.Report("reading the data", 0, 1);
        return ChoiceTableReader.Read(study)
            .Then(table => ChoicePanelBuilder.Build(study, table))
            .Then(panel => NestTreeBuilder.Build(study, panel.Alternatives)
                .Then(tree => CovariateBuilder.Build(study, panel, tree)
                    .Then(covariates => Done(new PanelAnalysisInput(panel, tree, covariates)))));

        Checked<PanelAnalysisInput> Done(PanelAnalysisInput input)
        {
            work.Report("reading the data", 1, 1);
            return Checked<PanelAnalysisInput>.Good(input);
        }
    }

    /// <summary>The fit, and what standard errors are made from.</summary>
    /// <param name="study">The study.</param>
    /// <param name="sample">The sample and its design.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static PanelAnalysisFit Fit(StudySpecification study, PanelAnalysisSample sample, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(sample);
        ArgumentNullException.ThrowIfNull(work);
        var form = study.Estimate.Form;
        var likelihood = LikelihoodKernel.Create(sample.Design, form, work.Threads);
        var model = MaximumLikelihood.Fit(likelihood, form, study.Estimate, work);
        // Sentences of later stages name clusters; from here on they know them by pseudonyms alone, unless their ids were asked for.
        var names = sample.ShowsIds ? sample.Design.Clusters : Pseudonyms.Of(sample.Sample.Sha256, sample.Design.Clusters);
        var evidence = InferenceInput.From(model, new ClusterRefitter(model, work.Threads), names) with
        {
            RefitsAtOnce = sample.RefitsAtOnce,
            Second = SecondClusters.Of(study, sample.Sample, model),
            Blocks = BlockBootstrap.Of(
                model, study.Inference, IndependenceBattery.SharedCalendar(study, sample.Sample) ? sample.Sample.Times.Occasion : null, work.Threads),
        };
        return new PanelAnalysisFit(study, sample, model, evidence);
    }

    /// <summary>Everything after the fit: standard errors, the test of independence, what was found.</summary>
    /// <param name="fit">What <see cref="Fit"/> made; refits that its evidence has a journal for are taken from there.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static AnalysisResult Conclude(PanelAnalysisFit fit, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(fit);
        ArgumentNullException.ThrowIfNull(work);
        var (study, sample, model, evidence) = fit;
        var inference = StandardErrors.Compute(evidence, study.Inference, work);
        var tests = TermTests.Run(
            evidence, TermTestPlan.Of(study, sample.Sample.Covariates, model.Layout, evidence, study.Inference), inference,
            new RestrictedRefitter(model, work.Cancellation), study.Inference, work);
        var diagnostics = IndependenceBattery.Run(study, sample.Sample, model, sample.Static, work);
        var stages = new FindingsInput(study, sample.Sample, model, inference, diagnostics)
        {
            Tests = tests, UtilityMaximisation = UtilityRange.Of(model, work), ShowsIds = sample.ShowsIds,
        };
        return ResultBuilder.Build(stages, FindingList.Of(stages));
    }
}

/// <summary>A panel and its covariates in memory.</summary>
/// <param name="Panel">The recorded panel.</param>
/// <param name="Tree">The nest tree over its alternatives.</param>
/// <param name="Covariates">The covariates on the estimation sample.</param>
public sealed record PanelAnalysisInput(ChoicePanel Panel, NestTree Tree, CovariateSet Covariates);

/// <summary>A fitted model on its way to standard errors.</summary>
/// <param name="Study">The study.</param>
/// <param name="Sample">The sample and its design.</param>
/// <param name="Model">The fitted model.</param>
/// <param name="Evidence">What standard errors are made from.</param>
public sealed record PanelAnalysisFit(StudySpecification Study, PanelAnalysisSample Sample, FittedModel Model, InferenceInput Evidence);
