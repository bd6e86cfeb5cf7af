using System.Text.Json;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>What result.json holds of the bootstrap besides its standard errors and intervals.</summary>
internal static class BootstrapJson
{
    public static void Write(Utf8JsonWriter json, BootstrapCounts bootstrap)
    {
        json.WriteNumber("requested", bootstrap.Requested);
        json.WriteNumber("done", bootstrap.Done);
        json.WriteNumber("retried", bootstrap.Retried);
        json.WriteArray("failed", bootstrap.Failed, f => json.WriteObject(() =>
        {
            json.WriteString("kind", f.Kind);
            json.WriteNumber("count", f.Count);
        }));
        json.WriteString("scheme", bootstrap.Scheme);
        json.WriteFigure("block_length", bootstrap.BlockLength);
        if (bootstrap.IsLengthAutomatic is { } automatic) json.WriteBoolean("block_length_automatic", automatic);
        else json.WriteNull("block_length_automatic");
        json.WriteFigure("target", bootstrap.Target);
        json.WriteFigure("target_coverage", bootstrap.TargetCoverage);
        json.WriteArray("failures", bootstrap.Failures, f => json.WriteObject(() =>
        {
            json.WriteNumber("replicate", f.Replicate);
            json.WriteString("kind", f.Kind);
            json.WriteArray("parameters", f.Parameters, json.WriteStringValue);
        }));
        if (bootstrap.ErrorsWithFailures is { } errors)
        {
            json.WriteArray("se_with_failures", errors, e =>
            {
                if (e is { } number) json.WriteNumberValue(number);
                else json.WriteNullValue();
            });
        }
        else
        {
            json.WriteNull("se_with_failures");
        }
    }

    /// <summary>Monte-Carlo errors of one parameter's bootstrap figures.</summary>
    public static void WriteErrors(Utf8JsonWriter json, BootstrapErrors errors) => json.WriteObject("bootstrap_errors", () =>
    {
        json.WriteFigure("se", errors.StandardError);
        ResultJson.WriteInterval(json, "percentile", errors.Percentile);
        ResultJson.WriteInterval(json, "bca", errors.Accelerated);
        ResultJson.WriteInterval(json, "t", errors.Studentised);
    });
}
