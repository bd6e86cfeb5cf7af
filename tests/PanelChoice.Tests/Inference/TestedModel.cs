using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Estimation;
using PanelChoice.Tests.Support;

namespace PanelChoice.Tests.Inference;

/// <summary>A fitted synthetic panel with what tests of its terms are made from.</summary>
internal sealed record TestedModel(
    SyntheticPanel Made, FittedModel Model, InferenceInput Input, InferenceResult Errors, StudySpecification Study, InferenceSettings Settings)
{
    public static readonly ImmutableArray<NestSpecification> TwoNests = [SyntheticPanel.Nest("land", "A", "B"), SyntheticPanel.Nest("water", "C", "D")];

    public static TestedModel Of(int seed, int persons, int occasions, InferenceSettings? settings = null, double habit = 0.8) =>
        Of(SyntheticPanel.Make(seed, persons, occasions, 4, TwoNests, [0.7, 0.5], habit: habit), settings);

    public static TestedModel Of(SyntheticPanel made, InferenceSettings? settings = null)
    {
        settings ??= new InferenceSettings("person", 0.95, JackknifeKind.Refit, 0, 7) { ScoreDraws = 0 };
        var model = Fits.Fit(made);
        Xunit.Assert.Equal(FitStatus.Converged, model.Status);
        var input = InferenceInput.From(model, new ClusterRefitter(model, 1));
        var study = Studies.With(
            Studies.History(PreviousRule.Step),
            Studies.Term("constant", new ConstantSource()).Each("A"), Studies.Column("attribute 1"), Studies.Column("attribute 2"),
            Studies.Term("same as last time", new LastChoiceSource(1))) with { Nests = made.Nests, Inference = settings };
        return new TestedModel(made, model, input, StandardErrors.Compute(input, settings, WorkContext.Quiet), study, settings);
    }

    public IRestrictedRefitter Refitter => new RestrictedRefitter(Model, CancellationToken.None);

    public int ParameterOf(string label) => Model.Layout.Parameters.Select((p, k) => (p, k)).First(x => x.p.Label == label).k;

    /// <summary>A test as the study would write it.</summary>
    public static TestSpecification Test(string name, string[] terms, double[]? values = null, bool equal = false) =>
        new(name, [.. terms.Select((t, i) => new TestedTerm(t, 20, 10 + i))], [.. values ?? []], equal, 18);

    public ImmutableArray<Problem> Problems(params TestSpecification[] tests) =>
        TermTestPlan.Problems(Study with { Tests = [.. tests] }, Made.Covariates.Covariates, Model.Layout);

    public ImmutableArray<TermTest> Plan(params TestSpecification[] tests) =>
        TermTestPlan.Of(Study with { Tests = [.. tests] }, Made.Covariates.Covariates, Model.Layout, Input, Settings);

    public TermTestResult Run(TestSpecification test, WorkContext? work = null) =>
        TermTests.Run(Input, [Plan(test)[^1]], Errors, Refitter, Settings, work ?? WorkContext.Quiet)[0];
}
