using System.Text.Encodings.Web;
using System.Text.Json;
using PanelChoice.Inference;

namespace PanelChoice.Results;

/// <summary>
/// <c>result.json</c>: UTF-8 without a mark, LF, a fixed order of fields, every number in its shortest form that reads back to the same bits.
/// </summary>
public static class ResultJson
{
    internal static readonly JsonWriterOptions Options = new()
    {
        Indented = true,
        NewLine = "\n",
        // The document stands in no web page, so that names stay legible in every script.
        Encoder = JavaScriptEncoder.UnsafeRelaxedJsonEscaping,
    };

    /// <summary>The document's bytes.</summary>
    /// <param name="result">The result.</param>
    public static byte[] Bytes(AnalysisResult result)
    {
        using var stream = new MemoryStream();
        Write(result, stream);
        return stream.ToArray();
    }

    /// <summary>Writes the document.</summary>
    /// <param name="result">The result.</param>
    /// <param name="stream">Where to; it stays open.</param>
    public static void Write(AnalysisResult result, Stream stream)
    {
        ArgumentNullException.ThrowIfNull(result);
        ArgumentNullException.ThrowIfNull(stream);
        using (var json = new Utf8JsonWriter(stream, Options))
        {
            json.WriteStartObject();
            json.WriteString("schema", AnalysisResult.Schema);
            json.WriteString("title", result.Title);
            WriteTool(json, result.Tool);
            WriteInputs(json, result.Inputs);
            WriteSettings(json, result.Settings);
            json.WriteArray("reasons", result.Reasons, r => json.WriteObject(() =>
            {
                json.WriteString("path", r.Path);
                json.WriteString("reason", r.Reason);
            }));
            WriteWarnings(json, result.Warnings);
            WriteSample(json, result.Sample);
            WriteFit(json, result.Fit);
            json.WriteArray("parameters", result.Parameters, p => WriteParameter(json, p));
            json.WriteObject("bootstrap", () => BootstrapJson.Write(json, result.Bootstrap));
            WriteJackknife(json, result.Jackknife);
            TwoWayResult.Write(json, result.TwoWay);
            RecommendationResult.Write(json, result.Recommendations);
            WriteCovariance(json, result.Covariance);
            WriteClusters(json, result.Clusters);
            json.WriteArray("tests", result.Tests, t => json.WriteObject(() => TestsJson.Write(json, t)));
            json.WriteArray("utility_maximisation", result.UtilityMaximisation, n => json.WriteObject(() => UtilityJson.Write(json, n)));
            json.WriteObject("diagnostics", () => DiagnosticsJson.Write(json, result.Diagnostics));
            json.WriteArray("findings", result.Findings, f => json.WriteObject(() =>
            {
                json.WriteString("id", f.Id);
                json.WriteString("topic", JsonWords.Of(f.Topic));
                json.WriteString("severity", JsonWords.Of(f.Severity));
                json.WriteString("sentence", f.Sentence);
                json.WriteArray("figures", f.Figures, x => json.WriteObject(() =>
                {
                    json.WriteString("name", x.Name);
                    json.WriteFigure("value", x.Value);
                }));
            }));
            json.WriteEndObject();
        }

        stream.WriteByte((byte)'\n');
    }

    internal static void WriteTool(Utf8JsonWriter json, ToolStamp tool) => json.WriteObject("tool", () =>
    {
        json.WriteString("version", tool.Version);
        json.WriteString("runtime", tool.Runtime);
        json.WriteString("kernel", tool.Kernel);
    });

    internal static void WriteInputs(Utf8JsonWriter json, InputStamps inputs) => json.WriteObject("inputs", () =>
    {
        foreach (var (name, stamp) in new[] { ("study", inputs.Study), ("data", inputs.Data) })
            json.WriteObject(name, () =>
            {
                json.WriteString("file", stamp.File);
                json.WriteString("sha256", stamp.Sha256);
            });
    });

    internal static void WriteWarnings(Utf8JsonWriter json, IEnumerable<ResultWarning> warnings) => json.WriteArray("warnings", warnings, w => json.WriteObject(() =>
    {
        json.WriteString("id", w.Id);
        json.WriteString("sentence", w.Sentence);
    }));

    internal static void WriteSample(Utf8JsonWriter json, SampleSummary sample) => json.WriteObject("sample", () =>
    {
        json.WriteNumber("rows_read", sample.RowsRead);
        json.WriteNumber("persons_read", sample.PersonsRead);
        json.WriteNumber("occasions_read", sample.OccasionsRead);
        json.WriteArray("left_out", sample.LeftOut, l => json.WriteObject(() =>
        {
            json.WriteString("reason", l.Reason);
            json.WriteNumber("occasions", l.Occasions);
        }));
        json.WriteNumber("persons", sample.Persons);
        json.WriteNumber("occasions", sample.Occasions);
        json.WriteArray("alternatives", sample.Alternatives, a => json.WriteObject(() =>
        {
            json.WriteString("name", a.Name);
            json.WriteNumber("offered", a.Offered);
            json.WriteNumber("chosen", a.Chosen);
        }));
    });

    private static void WriteSettings(Utf8JsonWriter json, RunSettings settings) => json.WriteObject("settings", () =>
    {
        json.WriteNumber("confidence", settings.Confidence);
        json.WriteObject("seeds", () =>
        {
            json.WriteNumber("estimate", settings.EstimateSeed);
            json.WriteNumber("bootstrap", settings.BootstrapSeed);
            json.WriteNumber("diagnostics", settings.DiagnosticsSeed);
        });
    });

    private static void WriteFit(Utf8JsonWriter json, FitSummary fit) => json.WriteObject("fit", () =>
    {
        json.WriteString("status", fit.Status);
        json.WriteString("form", fit.Form);
        json.WriteFigure("log_likelihood", fit.LogLikelihood);
        json.WriteFigure("log_likelihood_equal_probability", fit.LogLikelihoodEqualProbability);
        json.WriteFigure("log_likelihood_constants", fit.LogLikelihoodConstants);
        json.WriteNumber("free_parameters", fit.FreeParameters);
        json.WriteFigure("gradient_norm", fit.GradientNorm);
        json.WriteNumber("iterations", fit.Iterations);
        json.WriteObject("starts", () =>
        {
            json.WriteNumber("requested", fit.Starts.Requested);
            json.WriteNumber("converged", fit.Starts.Converged);
            json.WriteArray("optima", fit.Starts.Optima, o => json.WriteObject(() =>
            {
                json.WriteFigure("log_likelihood", o.LogLikelihood);
                json.WriteNumber("starts", o.Starts);
            }));
        });
        json.WriteArray("warnings", fit.Warnings, w => json.WriteObject(() =>
        {
            json.WriteString("id", w.Id);
            json.WriteString("sentence", w.Sentence);
            json.WriteArray("parameters", w.Parameters, json.WriteStringValue);
        }));
    });

    private static void WriteParameter(Utf8JsonWriter json, ParameterResult p) => json.WriteObject(() =>
    {
        json.WriteString("name", p.Name);
        json.WriteString("alternative", p.Alternative);
        json.WriteString("kind", p.Kind);
        json.WriteString("status", p.Status);
        if (p.SameAs is not null) json.WriteString("same_as", p.SameAs);
        if (p.Role is not null) json.WriteString("role", p.Role);
        json.WriteFigure("estimate", p.Estimate);
        json.WriteObject("se", () =>
        {
            json.WriteFigure("pooled", p.StandardErrors.Pooled);
            json.WriteFigure("outer_product", p.StandardErrors.OuterProduct);
            json.WriteFigure("robust", p.StandardErrors.Robust);
            json.WriteFigure("cluster", p.StandardErrors.Cluster);
            json.WriteFigure("jackknife", p.StandardErrors.Jackknife);
            json.WriteFigure("two_way", p.StandardErrors.TwoWay);
            json.WriteFigure("bootstrap", p.StandardErrors.Bootstrap);
            json.WriteFigure("bias_reduced", p.StandardErrors.BiasReduced);
        });
        json.WriteObject("interval", () =>
        {
            WriteInterval(json, "pooled", p.Intervals.Pooled);
            WriteInterval(json, "robust", p.Intervals.Robust);
            WriteInterval(json, "cluster", p.Intervals.Cluster);
            WriteInterval(json, "jackknife", p.Intervals.Jackknife);
            WriteInterval(json, "two_way", p.Intervals.TwoWay);
            WriteInterval(json, "bootstrap", p.Intervals.Bootstrap);
            WriteInterval(json, "bootstrap_percentile", p.Intervals.BootstrapPercentile);
            WriteInterval(json, "bootstrap_bca", p.Intervals.BootstrapAccelerated);
            WriteInterval(json, "bootstrap_t", p.Intervals.BootstrapStudentised);
            WriteInterval(json, "bias_reduced", p.Intervals.BiasReduced);
        });
        json.WriteObject("p_value", () =>
        {
            json.WriteFigure("pooled", p.PValues.Pooled);
            json.WriteFigure("robust", p.PValues.Robust);
            json.WriteFigure("cluster", p.PValues.Cluster);
            json.WriteFigure("jackknife", p.PValues.Jackknife);
            json.WriteFigure("two_way", p.PValues.TwoWay);
            json.WriteFigure("bootstrap", p.PValues.Bootstrap);
            json.WriteFigure("bias_reduced", p.PValues.BiasReduced);
        });
        json.WriteFigure("bootstrap_error", p.BootstrapError);
        BootstrapJson.WriteErrors(json, p.BootstrapErrors);
        json.WriteFigure("se_ratio", p.SeRatio);
        json.WriteFigure("equivalent_occasions", p.EquivalentOccasions);
        DriversJson.Write(json, p);
    });

    internal static void WriteInterval(Utf8JsonWriter json, string name, Interval? interval)
    {
        json.WritePropertyName(name);
        if (interval is null) json.WriteNullValue();
        else json.WriteRow([interval.Low, interval.High]);
    }

    private static void WriteJackknife(Utf8JsonWriter json, JackknifeCounts? jackknife)
    {
        if (jackknife is null)
        {
            json.WriteNull("jackknife");
            return;
        }

        json.WriteObject("jackknife", () =>
        {
            json.WriteString("kind", jackknife.Kind);
            json.WriteNumber("refits", jackknife.Refits);
            json.WriteNumber("failures", jackknife.Failures);
            json.WriteFigure("largest_decrement", jackknife.LargestDecrement);
            json.WriteNumber("refitted", jackknife.Refitted);
        });
    }

    private static void WriteCovariance(Utf8JsonWriter json, CovarianceMatrices covariance) => json.WriteObject("covariance", () =>
    {
        Matrix("pooled", covariance.Pooled);
        Matrix("outer_product", covariance.OuterProduct);
        Matrix("robust", covariance.Robust);
        Matrix("cluster", covariance.Cluster);
        Matrix("cluster_uncorrected", covariance.ClusterUncorrected);
        Matrix("jackknife", covariance.Jackknife);
        Matrix("two_way", covariance.TwoWay);
        Matrix("bootstrap", covariance.Bootstrap);
        Matrix("bias_reduced", covariance.BiasReduced);

        void Matrix(string name, SquareMatrix? matrix)
        {
            if (matrix is null) json.WriteNull(name);
            else json.WriteArray(name, Enumerable.Range(0, matrix.Order), i => json.WriteRow(matrix.Values.AsSpan(i * matrix.Order, matrix.Order)));
        }
    });

    private static void WriteClusters(Utf8JsonWriter json, ClusterResult clusters) => json.WriteObject("clusters", () =>
    {
        json.WriteString("by", clusters.By);
        json.WriteNumber("count", clusters.Count);
        json.WriteFigure("effective", clusters.Effective);
        json.WriteNumber("smallest", clusters.Smallest);
        json.WriteFigure("median", clusters.Median);
        json.WriteNumber("largest", clusters.Largest);
        json.WriteNumber("degrees_of_freedom", clusters.DegreesOfFreedom);
        json.WriteObject("leverage", () =>
        {
            json.WriteFigure("largest", clusters.LargestLeverage);
            json.WriteFigure("spread", clusters.LeverageSpread);
        });
        json.WriteFigure("size_spread", clusters.SizeSpread);
        json.WriteString("influence_from", clusters.InfluenceFrom);
        json.WriteArray("most_influential", clusters.MostInfluential, i => json.WriteObject(() =>
        {
            json.WriteString("person", i.Person);
            json.WriteString("term", i.Term);
            json.WriteFigure("change", i.Change);
        }));
    });
}
