using System.Text.Json;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>The tests of terms in <c>result.json</c>.</summary>
internal static class TestsJson
{
    /// <summary>Writes down why figures of the tests are null.</summary>
    public static void NoteReasons(IReadOnlyList<TermTestResult> tests, ReasonBook book)
    {
        for (var i = 0; i < tests.Count; i++)
        {
            var (path, test) = ($"tests[{i}]", tests[i]);
            foreach (var (kind, wald) in test.Wald)
            {
                var at = $"{path}.wald.{JsonWords.Of(kind)}";
                if (wald.Statistic is null) book.Note($"{at}.statistic", wald.Reason ?? "It was not made.");
                if (wald.DenominatorFreedom is null) book.Note($"{at}.df_denominator", wald.Reason ?? "The statistic is a chi-square.");
                if (wald.PValue is null) book.Note($"{at}.p_value", wald.Reason ?? "It was not made.");
            }

            if (test.LikelihoodRatio.Statistic is null) book.Note($"{path}.likelihood_ratio.statistic", test.LikelihoodRatio.Reason ?? "It was not made.");
            if (test.LikelihoodRatio.PValue is null) book.Note($"{path}.likelihood_ratio.p_value", test.LikelihoodRatio.Reason ?? "It was not made.");
            if (test.ScoreBootstrap is not { } score) book.Note($"{path}.score_bootstrap", test.ScoreReason ?? "It was not made.");
            else if (score.Reason is { } none) book.Note($"{path}.score_bootstrap", none);
            else if (score.Interval is null) book.Note($"{path}.score_bootstrap.interval", score.IntervalReason ?? "It was not made.");
        }
    }

    public static void Write(Utf8JsonWriter json, TermTestResult result)
    {
        var test = result.Test;
        json.WriteString("name", test.Name);
        json.WriteBoolean("by_default", test.IsDefault);
        json.WriteArray("terms", test.Terms, t => json.WriteObject(() =>
        {
            json.WriteString("name", t.Name);
            json.WriteString("alternative", t.Alternative);
        }));
        json.WritePropertyName("null");
        if (test.Null is { } values) json.WriteRow(values.AsSpan());
        else json.WriteStringValue("equal");
        json.WriteObject("wald", () =>
        {
            foreach (var (kind, wald) in result.Wald)
                json.WriteObject(JsonWords.Of(kind), () =>
                {
                    json.WriteFigure("statistic", wald.Statistic);
                    json.WriteNumber("df", wald.Freedom);
                    json.WriteFigure("df_denominator", wald.DenominatorFreedom);
                    json.WriteFigure("p_value", wald.PValue);
                });
        });
        json.WriteObject("likelihood_ratio", () =>
        {
            json.WriteFigure("statistic", result.LikelihoodRatio.Statistic);
            json.WriteNumber("df", result.LikelihoodRatio.Freedom);
            json.WriteFigure("p_value", result.LikelihoodRatio.PValue);
            json.WriteString("note", result.LikelihoodRatio.Note);
        });
        if (result.ScoreBootstrap is not { Reason: null } score)
        {
            json.WriteNull("score_bootstrap");
            return;
        }

        json.WriteObject("score_bootstrap", () =>
        {
            json.WriteString("weights", score.Weights == ScoreWeights.SixPoint ? "six_point" : "rademacher");
            json.WriteNumber("draws", score.Draws);
            json.WriteBoolean("enumerated", score.Enumerated);
            json.WriteFigure("statistic", score.Statistic);
            json.WriteFigure("p_value", score.PValue);
            json.WriteFigure("monte_carlo_error", score.MonteCarloError);
            json.WritePropertyName("interval");
            if (score.Interval is { } interval) json.WriteRow([interval.Low, interval.High]);
            else json.WriteNullValue();
        });
    }
}
