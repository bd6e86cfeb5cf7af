using System.Collections.Immutable;
using PanelChoice.Design;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Diagnostics;

/// <summary>The battery as a whole, on single simulated panels whose truth is known.</summary>
public class IndependenceBatteryTests
{
    [Fact]
    public void An_independent_panel_shows_no_sign_and_the_result_says_how_much_power_it_has()
    {
        var result = Run(Commutes(new CommuteProcess(), false, 1));
        Assert.Equal(Verdict.NoneFound, result.Verdict);
        Assert.Null(result.Cause);
        Assert.Null(result.HitRate);
        Assert.Null(result.LastPrediction);
        Assert.False(result.CommonDays);
        Assert.Equal([0, 0.3, 0.6, 0.8, 0.9, 1], result.Detector!.ByDecay.Select(d => d.Rho));
        Assert.Equal(result.Detector.Statistic, result.Detector.ByDecay.Max(d => d.Z));
        Assert.Equal([1, 2, 3, 4, 5], result.Lags.Select(l => l.Lag));
        Assert.Equal([760, 720, 680, 640, 600], result.Lags.Select(l => l.Pairs));
        Assert.Equal(["A", "B", "C", "D", "E"], result.ByAlternative.Select(a => a.Name));
        Assert.Equal(["first", "second"], result.ByNest.Select(n => n.Name));
        Assert.InRange(result.VarianceInflation!.Value, 0.6, 1.5);
        Assert.Contains(result.Notes, n => n.StartsWith("Power:", StringComparison.Ordinal));
        Assert.Equal("step", result.StepUnit);
    }

    [Fact]
    public void Lasting_taste_is_found_and_named_on_a_fit_with_person_means()
    {
        var result = Run(Commutes(new CommuteProcess { TasteSd = 1 }, false, 2));
        Assert.Equal(Verdict.Dependence, result.Verdict);
        Assert.Equal(DependenceCause.Taste, result.Cause);
        Assert.NotNull(result.HitRate);
        Assert.True(result.VarianceInflation > 1.5);
        Assert.All(result.Lags, l => Assert.True(l.Gamma > 2 * l.StandardError));
        Assert.Contains(result.Notes, n => n.Contains("person mean of cost", StringComparison.Ordinal));
        Assert.DoesNotContain(result.Notes, n => n.Contains("person mean of pass", StringComparison.Ordinal));
    }

    [Fact]
    public void Habit_left_out_of_the_model_is_told_from_taste_by_the_last_prediction()
    {
        var result = Run(Commutes(new CommuteProcess { Habit = 0.8 }, false, 3));
        Assert.Equal(DependenceCause.Habit, result.Cause);
        Assert.True(result.LastPrediction > 1.645);
    }

    [Fact]
    public void Taste_behind_a_modelled_habit_is_judged_on_the_model_without_past_choices()
    {
        var result = Run(Commutes(new CommuteProcess { TasteSd = 1, Habit = 0.8 }, true, 4));
        Assert.Equal(Verdict.Dependence, result.Verdict);
        Assert.Equal(DependenceCause.HabitAndTaste, result.Cause);
        Assert.Contains(result.Notes, n => n.Contains("analytic", StringComparison.Ordinal));
    }

    [Fact]
    public void Shocks_shared_by_everybody_on_a_date_are_common_days_without_a_cause()
    {
        var result = Run(Commutes(new CommuteProcess { DateSd = 0.7 }, false, 5));
        Assert.Equal(Verdict.Dependence, result.Verdict);
        Assert.True(result.CommonDays);
        Assert.Null(result.Cause);
    }

    [Fact]
    public void Lasting_shocks_to_everybody_are_taken_out_before_the_cause_is_judged()
    {
        var result = Run(Commutes(new CommuteProcess { DateSd = 1, DateCorrelation = 0.8, TasteSd = 1 }, false, 6));
        Assert.True(result.CommonDays);
        Assert.Equal(DependenceCause.Taste, result.Cause);
        Assert.Contains(result.Notes, n => n.Contains("deviations from each date's mean", StringComparison.Ordinal));
    }

    [Fact]
    public void Whole_numbers_are_no_shared_days_unless_the_study_says_so()
    {
        var made = Commutes(new CommuteProcess(), false, 1);
        var result = Run(made with { Study = made.Study with { Panel = made.Study.Panel with { SharedCalendar = null } } });
        Assert.Null(result.CommonDays);
        Assert.Null(result.DateScore);
        Assert.Contains(result.Notes, n => n.Contains("shared_calendar", StringComparison.Ordinal));
    }

    [Fact]
    public void Lags_longer_than_any_record_are_listed_without_a_figure()
    {
        var made = SimulatedCommutes.Make(60, 3, new CommuteProcess(), false, 7, 0);
        var result = Run(made);
        Assert.Equal([120, 60, 0, 0, 0], result.Lags.Select(l => l.Pairs));
        Assert.Equal([false, false, true, true, true], result.Lags.Select(l => double.IsNaN(l.Gamma)));
        Assert.Equal([false, false, true, true, true], result.Lags.Select(l => double.IsNaN(l.StandardError)));
    }

    [Fact]
    public void A_decay_without_any_pair_one_step_apart_is_left_out_of_the_detector()
    {
        // Every second day on a stated step rule: R(0) has no pair, the other decays see distances of two.
        var made = Commutes(new CommuteProcess { TasteSd = 1 }, false, 2);
        var panel = made.Covariates.Panel;
        var sparse = made with
        {
            Study = made.Study with { History = made.Study.History with { Previous = PreviousRule.Step } },
            Covariates = made.Covariates with { Panel = panel with { Occasion = [.. panel.Occasion.Select(o => 2 * o)] } },
        };
        var result = Run(sparse);
        Assert.True(double.IsNaN(result.Detector!.ByDecay[0].Z));
        Assert.All(result.Detector.ByDecay.Skip(1), d => Assert.True(d.Z > 0));
        Assert.Equal(0, result.Lags[0].Pairs);
        Assert.Equal(760, result.Lags[1].Pairs);
        Assert.Contains(result.Notes, n => n.Contains("decays", StringComparison.Ordinal));
    }

    [Fact]
    public void A_weighted_study_is_tested_on_an_unweighted_fit()
    {
        var made = Commutes(new CommuteProcess(), false, 1);
        var plain = Run(made);
        var panel = made.Covariates.Panel;
        var weighted = made with { Covariates = made.Covariates with { Panel = panel with { Weight = [.. panel.Weight.Select((_, p) => 0.5 + (p % 3))] } } };
        var result = Run(weighted);
        Assert.Contains(result.Notes, n => n.Contains("unweighted fit", StringComparison.Ordinal));
        Assert.Equal(plain.Detector!.Statistic, result.Detector!.Statistic, 1e-6);
    }

    [Fact]
    public void One_occasion_a_person_leaves_nothing_to_test()
    {
        var made = Commutes(new CommuteProcess(), false, 1);
        ImmutableArray<int> first = [.. made.Covariates.Panel.PersonStart.Take(40)];
        var set = made.Covariates with
        {
            Used = first,
            Covariates = [.. made.Covariates.Covariates.Select(c => c.IsConstant
                ? c
                : c with { Values = [.. first.SelectMany(o => c.Values.Skip(o * c.Enters.Length).Take(c.Enters.Length))] })],
        };
        var result = Run(made with { Covariates = set });
        Assert.Equal(Verdict.NotApplicable, result.Verdict);
        Assert.StartsWith("Nothing to test", result.Reason, StringComparison.Ordinal);
        Assert.Null(result.Detector);
        Assert.Empty(result.Lags);
    }

    [Theory]
    [InlineData(FitStatus.Boundary)]
    [InlineData(FitStatus.NotIdentified)]
    [InlineData(FitStatus.Separated)]
    [InlineData(FitStatus.Stopped)]
    public void A_fit_that_is_not_at_a_maximum_is_not_tested(FitStatus status)
    {
        var made = Commutes(new CommuteProcess(), false, 1);
        var model = Model(made) with { Status = status };
        var result = IndependenceBattery.Run(made.Study, made.Covariates, model, WorkContext.Quiet);
        Assert.Equal(Verdict.NotApplicable, result.Verdict);
        Assert.Contains("maximum", result.Reason, StringComparison.Ordinal);
    }

    [Fact]
    public void A_model_in_which_everything_is_fixed_is_not_tested_for_that_reason()
    {
        var made = Commutes(new CommuteProcess(), false, 1);
        var layout = made.Design.Layout;
        var design = made.Design with
        {
            Layout = new ParameterLayout([.. layout.Parameters.Select(p => p with { Fixed = 0.5 })], layout.Coefficients, layout.NodeParameter, layout.Nests),
        };
        var model = Model(made) with { Likelihood = LikelihoodKernel.Create(design, NestedLogitForm.UtilityScaled, 1) };
        var result = IndependenceBattery.Run(made.Study, made.Covariates, model, WorkContext.Quiet);
        Assert.Equal(Verdict.NotApplicable, result.Verdict);
        Assert.Contains("every parameter is fixed", result.Reason, StringComparison.Ordinal);
    }

    [Fact]
    public void A_singular_information_is_a_reason_and_no_exception()
    {
        var made = Commutes(new CommuteProcess(), false, 1);
        var cost = made.Covariates.Covariates[4];
        var doubled = made with { Covariates = made.Covariates with { Covariates = made.Covariates.Covariates.Insert(5, cost with { Term = "cost again" }) } };
        var design = doubled.Design;
        var likelihood = LikelihoodKernel.Create(design, NestedLogitForm.UtilityScaled, 1);
        var model = Model(made) with { Likelihood = likelihood, Parameters = made.Truth.Insert(5, 0) };
        var result = IndependenceBattery.Run(doubled.Study, doubled.Covariates, model, WorkContext.Quiet);
        Assert.Equal(Verdict.NotApplicable, result.Verdict);
        Assert.Contains("singular", result.Reason, StringComparison.Ordinal);
    }

    [Fact]
    public void Two_runs_and_any_number_of_threads_give_the_same_bits()
    {
        var made = Commutes(new CommuteProcess { TasteSd = 1 }, false, 2);
        var model = Model(made);
        var one = IndependenceBattery.Run(made.Study, made.Covariates, model, WorkContext.Quiet);
        var two = IndependenceBattery.Run(made.Study, made.Covariates, model, WorkContext.Quiet with { Threads = 2 });
        Assert.Equal(one.Detector!.ByDecay.AsEnumerable(), two.Detector!.ByDecay);
        Assert.Equal(one.Detector.PValue, two.Detector.PValue);
        Assert.Equal(one.DateScore, two.DateScore);
        Assert.Equal(one.Lags.AsEnumerable(), two.Lags);
        Assert.Equal(one.LastPrediction, two.LastPrediction);
        Assert.Equal(one.VarianceInflation, two.VarianceInflation);
    }

    [Fact]
    public void Collinear_person_means_are_left_out()
    {
        // A column that is a person's constant equals its own mean; one that varies adds something.
        var made = Commutes(new CommuteProcess(), false, 1);
        var set = made.Covariates;
        var pass = set.Covariates.Single(c => c.Term == "pass");
        var design = ChoiceDesignBuilder.Build(
            set with { Covariates = [.. set.Covariates, pass with { Term = "person mean of pass" }] }, made.Tree, made.Study.Nests, NestedLogitForm.UtilityScaled);
        Assert.Equal([set.Covariates.Length], PersonMeans.Collinear(design, set.Covariates.Length, 1));
        var varies = PersonMeans.VaryWithinPersons(design);
        Assert.False(varies[set.Covariates.IndexOf(pass)]);
        Assert.True(varies[set.Covariates.IndexOf(set.Covariates.Single(c => c.Term == "cost"))]);
    }

    [Fact]
    public void A_design_without_some_coefficients_is_the_one_that_never_had_them()
    {
        // The columns stay in the blocks; what is left out may stand before, between and behind what stays.
        var made = Commutes(new CommuteProcess(), false, 1);
        var all = made.Design;
        foreach (var leftOut in new int[][] { [0], [1, 3], [all.Layout.Coefficients - 1] })
        {
            var set = made.Covariates with { Covariates = [.. made.Covariates.Covariates.Where((_, k) => !leftOut.Contains(k))] };
            var without = ChoiceDesignBuilder.Build(set, made.Tree, made.Study.Nests, NestedLogitForm.UtilityScaled);
            var seen = all.Without(leftOut.ToHashSet());
            double[] at = [.. made.Truth.Where((_, k) => !leftOut.Contains(k))];
            double[] weight = [.. all.PersonWeight];
            var expected = LikelihoodKernel.Create(without, NestedLogitForm.UtilityScaled, 1).Evaluate(at, weight, Derivatives.Hessian);
            var actual = LikelihoodKernel.Create(seen, NestedLogitForm.UtilityScaled, 1).Evaluate(at, weight, Derivatives.Hessian);
            Assert.Equal(expected.Value, actual.Value);
            Assert.Equal(expected.Hessian.AsEnumerable(), actual.Hessian.AsEnumerable());
        }
    }

    [Fact]
    public void Simulated_commuters_choose_by_the_model_they_are_said_to_follow()
    {
        // Serially correlated errors change no single day's distribution: the static fit must find the truth then, too.
        var made = SimulatedCommutes.Make(1500, 6, new CommuteProcess { ErrorCorrelation = 0.3 }, false, 9, 0);
        var fit = NewtonFit.From(made.Design, NestedLogitForm.UtilityScaled, made.Truth);
        Assert.Equal(FitStatus.Converged, fit.Status);
        var k = fit.Parameters.Length;
        var variance = MathNet.Numerics.LinearAlgebra.Matrix<double>.Build.Dense(k, k, (r, c) => -fit.Hessian[(r * k) + c]).Inverse();
        // Pooled standard errors are up to 1.1 times too small under this correlation; four of them bound every deviation.
        for (var p = 0; p < k; p++) Assert.InRange(Math.Abs(fit.Parameters[p] - made.Truth[p]) / Math.Sqrt(variance[p, p]), 0, 4);
    }

    private static SimulatedCommutes Commutes(CommuteProcess process, bool lastChoice, long seed) =>
        SimulatedCommutes.Make(40, 20, process, lastChoice, seed, 0);

    private static FittedModel Model(SimulatedCommutes made) => NewtonFit.From(made.Design, NestedLogitForm.UtilityScaled, made.Truth);

    private static DiagnosticsResult Run(SimulatedCommutes made) =>
        IndependenceBattery.Run(made.Study, made.Covariates, Model(made), WorkContext.Quiet);
}
