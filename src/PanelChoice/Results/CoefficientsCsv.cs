using System.Globalization;
using System.Text;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary><c>coefficients.csv</c>: a row per parameter, for spreadsheets; RFC 4180 quoting, decimal points, LF, empty where a figure does not exist.</summary>
public static class CoefficientsCsv
{
    private static readonly (string Name, Func<ParameterResult, object?> Value)[] Columns =
    [
        ("name", p => p.Name),
        ("alternative", p => p.Alternative),
        ("kind", p => p.Kind),
        ("status", p => p.Status),
        ("estimate", p => p.Estimate),
        ("se_pooled", p => p.StandardErrors.Pooled),
        ("se_outer_product", p => p.StandardErrors.OuterProduct),
        ("se_robust", p => p.StandardErrors.Robust),
        ("se_cluster", p => p.StandardErrors.Cluster),
        ("se_jackknife", p => p.StandardErrors.Jackknife),
        ("se_two_way", p => p.StandardErrors.TwoWay),
        ("se_bootstrap", p => p.StandardErrors.Bootstrap),
        .. Ends("pooled", p => p.Intervals.Pooled),
        .. Ends("robust", p => p.Intervals.Robust),
        .. Ends("cluster", p => p.Intervals.Cluster),
        .. Ends("jackknife", p => p.Intervals.Jackknife),
        .. Ends("two_way", p => p.Intervals.TwoWay),
        .. Ends("bootstrap", p => p.Intervals.Bootstrap),
        .. Ends("bootstrap_percentile", p => p.Intervals.BootstrapPercentile),
        .. Ends("bootstrap_bca", p => p.Intervals.BootstrapAccelerated),
        .. Ends("bootstrap_t", p => p.Intervals.BootstrapStudentised),
        ("p_pooled", p => p.PValues.Pooled),
        ("p_robust", p => p.PValues.Robust),
        ("p_cluster", p => p.PValues.Cluster),
        ("p_jackknife", p => p.PValues.Jackknife),
        ("p_two_way", p => p.PValues.TwoWay),
        ("p_bootstrap", p => p.PValues.Bootstrap),
        ("bootstrap_error", p => p.BootstrapError),
        ("bootstrap_error_se", p => p.BootstrapErrors.StandardError),
        .. Ends("bootstrap_error_percentile", p => p.BootstrapErrors.Percentile),
        .. Ends("bootstrap_error_bca", p => p.BootstrapErrors.Accelerated),
        .. Ends("bootstrap_error_t", p => p.BootstrapErrors.Studentised),
        ("se_ratio", p => p.SeRatio),
        ("equivalent_occasions", p => p.EquivalentOccasions),
        ("se_bias_reduced", p => p.StandardErrors.BiasReduced),
        .. Ends("bias_reduced", p => p.Intervals.BiasReduced),
        ("p_bias_reduced", p => p.PValues.BiasReduced),
        ("df_bias_reduced", p => p.Degrees.BiasReduced),
        ("effective_clusters", p => p.EffectiveClusters),
    ];

    /// <summary>Writes the table.</summary>
    /// <param name="result">The result.</param>
    /// <param name="stream">Where to; it stays open.</param>
    public static void Write(AnalysisResult result, Stream stream)
    {
        ArgumentNullException.ThrowIfNull(result);
        var text = new StringBuilder().AppendJoin(',', Columns.Select(c => c.Name)).Append('\n');
        foreach (var parameter in result.Parameters)
            text.AppendJoin(',', Columns.Select(c => Cell(c.Value(parameter)))).Append('\n');
        stream.Write(Encoding.UTF8.GetBytes(text.ToString()));
    }

    private static (string Name, Func<ParameterResult, object?> Value)[] Ends(string kind, Func<ParameterResult, Interval?> interval) =>
        [($"low_{kind}", p => interval(p)?.Low), ($"high_{kind}", p => interval(p)?.High)];

    private static string Cell(object? value) => value switch
    {
        null => "",
        double number => number.ToString("R", CultureInfo.InvariantCulture),
        string text when text.AsSpan().IndexOfAny(",\"\r\n") >= 0 => "\"" + text.Replace("\"", "\"\"", StringComparison.Ordinal) + "\"",
        _ => (string)value,
    };
}
