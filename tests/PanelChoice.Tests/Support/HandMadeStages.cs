using PanelChoice.Covariates;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Results;
using PanelChoice.Study;
using PanelChoice.Tests.Inference;

namespace PanelChoice.Tests.Support;

/// <summary>
/// What the stages hand to the findings, for a small synthetic panel with two nests and a last choice, without any file: fitted by the plain
/// Newton of the inference tests, diagnosed by hand. Tests change one record at a time.
/// </summary>
internal static class HandMadeStages
{
    public static readonly DiagnosticsResult Taste = new(
        Verdict.Dependence, null, DependenceCause.Taste, false, 0.05,
        new Detector(6.25, 0.0001, [new DecayScore(0, 3.5), new DecayScore(1, 6.25)]), new DateScore(0.4, 0.34),
        [new LagDependence(1, 0.21, 0.06, 240), new LagDependence(2, 0.19, 0.065, 200)],
        [new PartScore("A", 3.1), new PartScore("B", -0.2)], [new PartScore("land", 1.5)], 1.4,
        new HitRate(0.9, "200 simulated panels of 40 persons x 20 occasions"), 0.2, "step", ["The p-value is analytic."]);

    public static readonly DiagnosticsResult Quiet = Taste with
    {
        Verdict = Verdict.NoneFound, Cause = null, HitRate = null, Detector = new Detector(0.7, 0.41, [new DecayScore(0, 0.7)]), Notes = [],
    };

    private static readonly Lazy<FindingsInput> FourteenPersons = new(() => Make(14));
    private static readonly Lazy<FindingsInput> ManyPersons = new(() => Make(120));

    /// <summary>120 persons x 8 occasions; dependence by taste.</summary>
    public static FindingsInput Many => ManyPersons.Value;

    /// <summary>14 persons x 8 occasions: fewer clusters than a clustered standard error wants.</summary>
    public static FindingsInput Fourteen => FourteenPersons.Value;

    public static AnalysisResult Result(FindingsInput stages) => ResultBuilder.Build(stages, FindingList.Of(stages));

    private static FindingsInput Make(int persons)
    {
        var made = SyntheticPanel.Make(
            11, persons, 8, 4, [SyntheticPanel.Nest("land", "A", "B"), SyntheticPanel.Nest("water", "C", "D") with { SameAs = "land" }], [0.7], habit: 0.8);
        var (model, refitter) = NewtonRefitter.Fit(made.Design(), made.Truth);
        model = model with
        {
            LogLikelihoodEqualProbability = -400, GradientNorm = 1e-9, StartsRequested = 3, StartsConverged = 3,
            Optima = [new Optimum(model.LogLikelihood, 3, model.Parameters)],
        };
        var study = Studies.With(
            Studies.History(PreviousRule.Step),
            Studies.Term("constant", new ConstantSource()).Each("A"), Studies.Column("attribute 1"), Studies.Column("attribute 2"),
            Studies.Term("same as last time", new LastChoiceSource(1))) with
        {
            Title = "Hand-made panel", Nests = made.Nests,
            Inference = new InferenceSettings("person", 0.95, JackknifeKind.Refit, 19, 7),
            Tests = [new TestSpecification("attributes cancel", [new TestedTerm("attribute 1", 1, 1), new TestedTerm("attribute 2", 1, 1)], [-0.5, 0.5], false, 1)],
        };
        var sample = EstimationSample.Of(made.Covariates) with { LeftOut = [new LeftOut("first recorded occasion", 3), new LeftOut("never happened", 0)] };
        var evidence = InferenceInput.From(model, refitter) with { Clusters = Pseudonyms.Of(sample.Sha256, model.Design.Clusters) };
        var inference = StandardErrors.Compute(evidence, study.Inference, WorkContext.Quiet);
        return new FindingsInput(study, sample, model, inference, Taste)
        {
            UtilityMaximisation = UtilityRange.Of(model, WorkContext.Quiet),
            Tests = TermTests.Run(
                evidence, TermTestPlan.Of(study, sample.Covariates, model.Layout, evidence, study.Inference), inference,
                new RestrictedRefitter(model, CancellationToken.None), study.Inference, WorkContext.Quiet),
        };
    }
}
