using System.Text.Json;
using PanelChoice.Diagnostics;

namespace PanelChoice.Results;

/// <summary>The independence battery's part of <c>result.json</c>.</summary>
internal static class DiagnosticsJson
{
    public static void Write(Utf8JsonWriter json, DiagnosticsResult diagnostics)
    {
        json.WriteBoolean("applicable", diagnostics.Verdict != Verdict.NotApplicable);
        json.WriteString("reason", diagnostics.Reason);
        json.WriteString("verdict", JsonWords.Of(diagnostics.Verdict));
        json.WriteString("cause", diagnostics.Cause is { } cause ? JsonWords.Of(cause) : null);
        if (diagnostics.CommonDays is { } common) json.WriteBoolean("common_days", common);
        else json.WriteNull("common_days");
        json.WriteFigure("level", diagnostics.Level);
        if (diagnostics.Detector is { } detector)
            json.WriteObject("detector", () =>
            {
                json.WriteFigure("statistic", detector.Statistic);
                json.WriteFigure("p_value", detector.PValue);
                json.WriteArray("by_decay", detector.ByDecay, d => json.WriteObject(() =>
                {
                    json.WriteFigure("rho", d.Rho);
                    json.WriteFigure("z", d.Z);
                }));
            });
        else
            json.WriteNull("detector");
        if (diagnostics.DateScore is { } score)
            json.WriteObject("date_score", () =>
            {
                json.WriteFigure("z", score.Z);
                json.WriteFigure("p_value", score.PValue);
            });
        else
            json.WriteNull("date_score");
        json.WriteArray("lags", diagnostics.Lags, l => json.WriteObject(() =>
        {
            json.WriteNumber("lag", l.Lag);
            json.WriteFigure("gamma", l.Gamma);
            json.WriteFigure("se", l.StandardError);
            json.WriteNumber("pairs", l.Pairs);
        }));
        WriteParts(json, "by_alternative", "alternative", diagnostics.ByAlternative);
        json.WriteFigure("variance_inflation", diagnostics.VarianceInflation);
        if (diagnostics.HitRate is { } rate)
            json.WriteObject("hit_rate", () =>
            {
                json.WriteFigure("rate", rate.Rate);
                json.WriteString("source", rate.Source);
            });
        else
            json.WriteNull("hit_rate");
        json.WriteNull("bootstrap");
        WriteParts(json, "by_nest", "nest", diagnostics.ByNest);
        json.WriteString("step_unit", diagnostics.StepUnit);
        json.WriteArray("notes", diagnostics.Notes, json.WriteStringValue);
    }

    private static void WriteParts(Utf8JsonWriter json, string name, string part, IEnumerable<PartScore> scores) =>
        json.WriteArray(name, scores, s => json.WriteObject(() =>
        {
            json.WriteString(part, s.Name);
            json.WriteFigure("z", s.Z);
        }));
}
