using PanelChoice.Diagnostics;
using Xunit;

namespace PanelChoice.Tests.Diagnostics;

/// <summary>The rule on hand-made tables: each branch, with figures of the order that simulated panels of 3,000 persons gave.</summary>
public class CauseRuleTests
{
    private const double Level = 0.05;

    [Fact]
    public void A_flat_profile_without_an_effect_of_the_last_prediction_is_lasting_taste() =>
        Assert.Equal(
            new CauseJudgement(DependenceCause.Taste, true, false, false), Judge([0.69, 0.69, 0.69, 0.69, 0.69, 0.69], lastPrediction: -0.01));

    [Fact]
    public void A_fading_profile_with_an_effect_of_the_last_prediction_is_habit() =>
        Assert.Equal(new CauseJudgement(DependenceCause.Habit, false, true, true), Judge([0.74, 0.17, 0.05, 0.01, 0.01, 0.02], lastPrediction: 0.835));

    [Fact]
    public void A_plateau_below_a_peak_with_an_effect_of_the_last_prediction_is_habit_and_taste() =>
        Assert.Equal(
            new CauseJudgement(DependenceCause.HabitAndTaste, true, true, true), Judge([1.02, 0.47, 0.34, 0.33, 0.33, 0.32], lastPrediction: 0.83));

    [Fact]
    public void A_fading_profile_without_an_effect_of_the_last_prediction_is_serially_correlated_errors() =>
        Assert.Equal(new CauseJudgement(DependenceCause.SerialErrors, false, false, true), Judge([0.36, 0.08, 0.03, 0.02, 0, 0], lastPrediction: -0.01));

    [Fact]
    public void Nothing_is_told_when_the_static_fit_itself_shows_no_dependence() =>
        Assert.Equal(DependenceCause.Unclear, Judge([0.69, 0.69, 0.69, 0.69, 0.69, 0.69], -0.01, pValue: 0.2).Cause);

    [Fact]
    public void Nothing_is_told_when_lag_one_is_not_above_the_tail() =>
        Assert.Equal(DependenceCause.Unclear, Judge([0.05, 0.04, 0.03, 0.02, 0.02, 0.02], 0).Cause);

    [Fact]
    public void An_effect_of_the_last_prediction_too_loose_to_be_ruled_out_keeps_serial_errors_from_being_told() =>
        Assert.Equal(DependenceCause.Unclear, Judge([0.36, 0.08, 0.03, 0.02, 0, 0], 0.1, lastPredictionError: 0.2).Cause);

    [Fact]
    public void Without_the_last_prediction_serial_errors_are_not_told() =>
        Assert.Equal(DependenceCause.Unclear, Judge([0.36, 0.08, 0.03, 0.02, 0, 0], null).Cause);

    [Fact]
    public void A_tail_below_half_of_lag_two_is_no_plateau() =>
        Assert.False(Judge([0.83, 0.43, 0.26, 0.16, 0.09, 0.05], -0.02).Plateau);

    [Fact]
    public void A_significant_tail_behind_a_lag_two_below_zero_is_a_plateau() =>
        Assert.True(Judge([0.3, -0.02, 0.2, 0.2, 0.2, 0.2], 0).Plateau);

    [Fact]
    public void Without_lags_of_four_or_more_there_is_neither_plateau_nor_peak() =>
        Assert.Equal(new CauseJudgement(DependenceCause.Unclear, false, false, false), Judge([0.69, 0.69, 0.69], 0));

    [Fact]
    public void With_five_occasions_lag_four_alone_is_the_tail() =>
        Assert.Equal(DependenceCause.Taste, Judge([0.69, 0.69, 0.69, 0.69], 0).Cause);

    [Fact]
    public void A_stricter_level_asks_for_a_clearer_effect()
    {
        // z of the last prediction is 2: above the one-sided quantile of 5 percent, below that of 1 percent.
        Assert.True(Judge([0.74, 0.17, 0.05, 0, 0, 0], 0.1, lastPredictionError: 0.05).Habit);
        Assert.False(CauseRule.Judge(Evidence([0.74, 0.17, 0.05, 0, 0, 0], 0.1, 0.05, 0.001), 0.01).Habit);
    }

    private static CauseJudgement Judge(double[] gamma, double? lastPrediction, double lastPredictionError = 0.02, double pValue = 0.001) =>
        CauseRule.Judge(Evidence(gamma, lastPrediction, lastPredictionError, pValue), Level);

    private static CauseEvidence Evidence(double[] gamma, double? lastPrediction, double lastPredictionError, double pValue)
    {
        const double error = 0.05;
        static LagEvidence At(int lag, double effect, double se) => new(lag, effect / (se * se), 1 / (se * se));
        return new CauseEvidence(
            pValue, [.. gamma.Select((g, h) => At(h + 1, g, error))], lastPrediction is { } p ? At(1, p, lastPredictionError) : null);
    }
}
