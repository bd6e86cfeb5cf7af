using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
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
        Prepare(study, work).Then(input => Checked<AnalysisResult>.Good(Analyse(study, input, work)));

    /// <summary>The first half: reads and checks the data and builds the covariates.</summary>
    /// <param name="study">The study.</param>
    /// <param name="work">Progress and cancellation.</param>
    /// <returns>What an analysis starts from, or every problem found.</returns>
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

    /// <summary>The second half: everything after the covariates.</summary>
    /// <param name="study">The study.</param>
    /// <param name="input">What <see cref="Prepare"/> made.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static AnalysisResult Analyse(StudySpecification study, PanelAnalysisInput input, WorkContext work) =>
        Conclude(Fit(study, input, work), work);

    /// <summary>The fit, and what standard errors are made from.</summary>
    /// <param name="study">The study.</param>
    /// <param name="input">What <see cref="Prepare"/> made.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static PanelAnalysisFit Fit(StudySpecification study, PanelAnalysisInput input, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(input);
        ArgumentNullException.ThrowIfNull(work);
        var form = study.Estimate.Form;
        var design = ChoiceDesignBuilder.Build(input.Covariates, input.Tree, study.Nests, form);
        var likelihood = LikelihoodKernel.Create(design, form, work.Threads);
        var model = MaximumLikelihood.Fit(likelihood, form, study.Estimate, work);
        // Sentences of later stages name clusters; from here on they know them by pseudonyms alone.
        var pseudonyms = Pseudonyms.Of(input.Panel.Table.Sha256, design.Clusters);
        return new PanelAnalysisFit(study, input, model, InferenceInput.From(model, new ClusterRefitter(model, work.Threads), pseudonyms));
    }

    /// <summary>Everything after the fit: standard errors, the test of independence, what was found.</summary>
    /// <param name="fit">What <see cref="Fit"/> made; refits that its evidence has a journal for are taken from there.</param>
    /// <param name="work">Threads, progress, cancellation; no figure depends on them.</param>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static AnalysisResult Conclude(PanelAnalysisFit fit, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(fit);
        ArgumentNullException.ThrowIfNull(work);
        var (study, input, model, evidence) = fit;
        var inference = StandardErrors.Compute(evidence, study.Inference, work);
        var diagnostics = IndependenceBattery.Run(study, input.Covariates, model, work);
        var stages = new FindingsInput(study, input.Covariates, model, inference, diagnostics);
        return ResultBuilder.Build(stages, FindingList.Of(stages));
    }
}

/// <summary>What an analysis starts from.</summary>
/// <param name="Panel">The recorded panel.</param>
/// <param name="Tree">The nest tree over its alternatives.</param>
/// <param name="Covariates">The covariates on the estimation sample.</param>
public sealed record PanelAnalysisInput(ChoicePanel Panel, NestTree Tree, CovariateSet Covariates);

/// <summary>A fitted model on its way to standard errors.</summary>
/// <param name="Study">The study.</param>
/// <param name="Input">The panel and its covariates.</param>
/// <param name="Model">The fitted model.</param>
/// <param name="Evidence">What standard errors are made from.</param>
public sealed record PanelAnalysisFit(StudySpecification Study, PanelAnalysisInput Input, FittedModel Model, InferenceInput Evidence);
