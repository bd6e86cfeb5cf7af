using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;

namespace PanelChoice.Diagnostics;

/// <summary>
/// Does independence hold? Score tests on generalised residuals of the fitted model, effect sizes, and a rule for the likely cause.
/// The detector is the largest of one-sided, bias-corrected scores of exponentially weighted past residuals (locally best against
/// autocorrelated or lasting utility shocks), with expected-information variance and the estimation effect removed; the date score looks for
/// shocks that everybody shares on a date, which persons' own pasts cannot show. Generalised residuals: Gourieroux, Monfort, Renault and
/// Trognon (1987); estimation effect: Newey (1985), Tauchen (1985); variance components by scores: Chesher (1984); all quoted from memory.
/// Formulas stand at the moments; size, power and hit rates were measured on simulated panels.
/// </summary>
public static class IndependenceBattery
{
    private const int FewPersons = 100;
    private const string Step = "independence tests";

    /// <summary>Runs the battery.</summary>
    /// <param name="study">The study: rule for looking back, shared calendar, level, lags, draws, seed.</param>
    /// <param name="covariates">Covariates of the fitted model on the estimation sample.</param>
    /// <param name="model">The fitted model.</param>
    /// <param name="work">Threads (no figure depends on them), progress, cancellation.</param>
    /// <returns>The outcome; with verdict "not applicable" and its reason where there is nothing to test or no maximum to test at.</returns>
    /// <exception cref="OperationCanceledException">Cancelled.</exception>
    public static DiagnosticsResult Run(StudySpecification study, CovariateSet covariates, FittedModel model, WorkContext work)
    {
        ArgumentNullException.ThrowIfNull(study);
        ArgumentNullException.ThrowIfNull(covariates);
        ArgumentNullException.ThrowIfNull(model);
        ArgumentNullException.ThrowIfNull(work);
        var sample = EstimationSample.Of(covariates);
        var tree = model.Design.Tree;
        return Run(study, sample, model, () => StaticDesign.Of(study, sample, model.Design, Build), work);

        ChoiceDesign? Build(ImmutableArray<TermSpecification> terms) =>
            CovariateBuilder.BuildOn(study, covariates.Panel, tree, terms, covariates.Used).Value is { } set
                ? ChoiceDesignBuilder.Build(set, tree, study.Nests, model.Form)
                : null;
    }

    /// <summary>Runs the battery on a sample whose panel and covariates need not be in memory.</summary>
    /// <param name="study">The study.</param>
    /// <param name="sample">The sample of the fitted model.</param>
    /// <param name="model">The fitted model.</param>
    /// <param name="staticDesign">Makes the design on which the cause is judged; called only where dependence is found.</param>
    /// <param name="work">Threads (no figure depends on them), progress, cancellation.</param>
    internal static DiagnosticsResult Run(
        StudySpecification study, EstimationSample sample, FittedModel model, Func<StaticDesign?> staticDesign, WorkContext work)
    {
        var positions = OccasionPositions.Of(study.History, sample);
        var notes = new List<string>();
        DiagnosticsResult NotApplicable(string reason) => new(
            Verdict.NotApplicable, reason, null, null, study.Diagnostics.Level, null, null, [], [], [], null, null, null, positions.Unit, [.. notes]);

        work.Report(Step, 0, 3);
        var design = model.Design;
        if (Longest(design) < 2) return NotApplicable("Nothing to test: each person has one occasion in the estimation sample.");
        if (model.Status != FitStatus.Converged)
            return NotApplicable($"Not tested: the fit is not at an interior maximum ({InWords(model.Status)}), and the tests hold only there.");
        if (design.Layout.Free.IsEmpty) return NotApplicable("Not tested: every parameter is fixed by the study, so that no fitted model stands to be tested.");
        if (design.PersonWeight.Any(w => w != design.PersonWeight[0]))
        {
            model = Refit(study, model, work);
            design = model.Design;
            if (model.Status != FitStatus.Converged)
                return NotApplicable($"Not tested: the tests run on an unweighted fit of the same model, and that did not converge ({InWords(model.Status)}).");
            notes.Add("The study is weighted; the independence tests run on an unweighted fit of the same model.");
        }

        var dates = SharedCalendar(study, sample) ? sample.Times.Occasion : null;
        work.Report(Step, 1, 3);
        var lags = Math.Max(study.Diagnostics.Lags, CauseEvidence.LargestLag);
        if (ScoreBattery.Compute(design, model.Form, model.Parameters, positions, lags, dates, false, work.Threads) is not { } battery)
            return NotApplicable("Not tested: the expected information of the free parameters is singular at the estimates.");
        if (DecayGridDetector.Of(battery, study.Diagnostics.Draws, study.Diagnostics.Seed) is not { } detector)
            return NotApplicable("Not tested: no two occasions of a person leave any variance to compare residuals by.");
        work.Report(Step, 2, 3);
        var date = battery.Date is { IsDefined: true } d ? new DateScore(d.Z, d.PValue) : null;
        var verdict = VerdictRule.Judge(detector.PValue, date?.PValue, study.Diagnostics.Level);
        AddNotes(notes, study, design, positions, detector, verdict, dates is not null && date is null);

        var cause = verdict.Serial
            ? CauseFinding.Of(study, sample, staticDesign, model.Form, positions, dates, verdict.CommonDays == true, work)
            : null;
        if (cause is not null) notes.AddRange(cause.Notes);
        work.Report(Step, 3, 3);
        return new DiagnosticsResult(
            verdict.Verdict, null, cause?.Cause, verdict.CommonDays, study.Diagnostics.Level, detector, date,
            [.. battery.Lags.Take(study.Diagnostics.Lags).Select((s, h) => new LagDependence(h + 1, s.Effect, s.EffectError, s.Pairs))],
            [.. battery.Alternatives.Select((s, j) => new PartScore(design.Tree.Alternatives[j], s.Z))],
            [.. battery.Nests.Select((s, m) => new PartScore(design.Layout.Nests[m].Name, s.Z))],
            battery.InformationTrace.IsDefined ? battery.VarianceInflation : null,
            MeasuredRates.HitRateOf(cause?.Cause, design.Persons, MeanOccasions(design)),
            cause?.LastPrediction, positions.Unit, [.. notes]);
    }

    /// <summary>Whether an occasion is the same day for everybody: as stated, by default for dates only.</summary>
    internal static bool SharedCalendar(StudySpecification study, EstimationSample sample) =>
        sample.SharesCalendar(study);

    private static void AddNotes(
        List<string> notes, StudySpecification study, ChoiceDesign design, OccasionPositions positions, Detector detector, JointVerdict verdict,
        bool dateUntestable)
    {
        var pastChoice = study.Terms.Any(StaticDesign.IsPastChoice);
        if (verdict.Verdict == Verdict.NoneFound) notes.Add(MeasuredRates.Power(design.Persons, MeanOccasions(design), pastChoice));
        if (pastChoice && design.Persons < FewPersons)
            notes.Add("The detector's p-value is analytic; with a past choice in the model and fewer than 100 persons its true size at nominal 5 percent was 5-8 percent in simulated panels, about 10 with 75 occasions.");
        if (verdict.CommonDays is null)
            notes.Add(dateUntestable
                ? "Shocks common to a date could not be tested: no date leaves enough variance between persons."
                : "Shocks common to a date were not tested: the study does not say that an occasion is the same day for everybody (shared_calendar).");
        if (positions.Unit == "recorded occasion")
            notes.Add("Distances between occasions count recorded occasions, because most are more than one step of the calendar apart.");
        if (detector.ByDecay.Any(d => double.IsNaN(d.Z)))
            notes.Add("Some decays of the detector have no pair of occasions to work on and are left out.");
        if (design.ClusterBy != "person")
            notes.Add($"The tests look along each person's own past and across a date; dependence between the persons of one cluster ({design.ClusterBy}) is not tested.");
    }

    private static FittedModel Refit(StudySpecification study, FittedModel model, WorkContext work) => MaximumLikelihood.Fit(
        LikelihoodKernel.Create(model.Design.Unweighted(), model.Form, work.Threads), model.Form, study.Estimate, work);

    private static int Longest(ChoiceDesign design) =>
        design.Persons == 0 ? 0 : Enumerable.Range(0, design.Persons).Max(p => design.PersonStart[p + 1] - design.PersonStart[p]);

    private static double MeanOccasions(ChoiceDesign design) => (double)design.Situations / design.Persons;

    private static string InWords(FitStatus status) => status switch
    {
        FitStatus.NotIdentified => "not identified",
        FitStatus.Separated => "separated",
        FitStatus.Boundary => "a dissimilarity at its boundary",
        _ => "stopped before a maximum",
    };
}
