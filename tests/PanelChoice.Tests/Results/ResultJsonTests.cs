using System.Text;
using System.Text.Json;
using PanelChoice.Covariates;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Findings;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Results;
using PanelChoice.Tests.Inference;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Results;

/// <summary>The result document keeps its contract: names, nesting, order, nulls with reasons, full matrices, every bit of a number.</summary>
public class ResultJsonTests
{
    private static readonly AnalysisResult Result = HandMadeStages.Result(HandMadeStages.Many);
    private static readonly JsonElement Document = Parse(Result);

    [Theory]
    [InlineData("", "schema title tool inputs settings reasons warnings sample fit parameters bootstrap jackknife two_way recommendations covariance clusters tests utility_maximisation diagnostics findings")]
    [InlineData("tool", "version runtime kernel")]
    [InlineData("inputs", "study data")]
    [InlineData("inputs.study", "file sha256")]
    [InlineData("inputs.data", "file sha256")]
    [InlineData("settings", "confidence seeds")]
    [InlineData("settings.seeds", "estimate bootstrap diagnostics")]
    [InlineData("reasons.0", "path reason")]
    [InlineData("warnings.0", "id sentence")]
    [InlineData("sample", "rows_read persons_read occasions_read left_out persons occasions alternatives")]
    [InlineData("sample.left_out.0", "reason occasions")]
    [InlineData("sample.alternatives.0", "name offered chosen")]
    [InlineData("fit", "status form log_likelihood log_likelihood_equal_probability log_likelihood_constants free_parameters gradient_norm iterations starts warnings")]
    [InlineData("fit.starts", "requested converged optima")]
    [InlineData("fit.starts.optima.0", "log_likelihood starts")]
    [InlineData("parameters.0", "name alternative kind status role estimate se interval p_value bootstrap_error bootstrap_errors se_ratio equivalent_occasions degrees_of_freedom effective_clusters partial_leverage influence")]
    [InlineData("parameters.7", "name alternative kind status same_as estimate se interval p_value bootstrap_error bootstrap_errors se_ratio equivalent_occasions degrees_of_freedom effective_clusters partial_leverage influence")]
    [InlineData("parameters.0.se", "pooled outer_product robust cluster jackknife two_way bootstrap bias_reduced")]
    [InlineData("parameters.0.interval", "pooled robust cluster jackknife two_way bootstrap bootstrap_percentile bootstrap_bca bootstrap_t bias_reduced")]
    [InlineData("parameters.0.p_value", "pooled robust cluster jackknife two_way bootstrap bias_reduced")]
    [InlineData("parameters.0.degrees_of_freedom", "cluster jackknife two_way bias_reduced bootstrap")]
    [InlineData("bootstrap", "requested done retried failed scheme block_length block_length_automatic target target_coverage failures se_with_failures")]
    [InlineData("jackknife", "kind refits failures largest_decrement refitted")]
    [InlineData("covariance", "pooled outer_product robust cluster cluster_uncorrected jackknife two_way bootstrap bias_reduced")]
    [InlineData("clusters", "by count effective smallest median largest degrees_of_freedom leverage size_spread influence_from most_influential")]
    [InlineData("clusters.most_influential.0", "person term change")]
    [InlineData("diagnostics", "applicable reason verdict cause common_days level detector date_score lags by_alternative variance_inflation hit_rate bootstrap by_nest step_unit notes")]
    [InlineData("diagnostics.detector", "statistic p_value by_decay")]
    [InlineData("diagnostics.detector.by_decay.0", "rho z")]
    [InlineData("diagnostics.date_score", "z p_value")]
    [InlineData("diagnostics.lags.0", "lag gamma se pairs")]
    [InlineData("diagnostics.by_alternative.0", "alternative z")]
    [InlineData("diagnostics.hit_rate", "rate source")]
    public void Fields_have_their_names_and_their_order(string path, string names) =>
        Assert.Equal(names.Split(' '), At(Document, path).EnumerateObject().Select(p => p.Name));

    [Fact]
    public void Every_missing_figure_has_its_reason()
    {
        var stages = HandMadeStages.Many;
        var poor = HandMadeStages.Result(stages with
        {
            Diagnostics = HandMadeStages.Quiet with { DateScore = null, CommonDays = null, VarianceInflation = null, Lags = [new LagDependence(3, double.NaN, double.NaN, 0)] },
        });
        var jackknife = stages.Inference.Covariances[CovarianceKind.Jackknife];
        var lost = jackknife with { RefusedParameters = [2], RefusedReasons = ["Without a person it cannot be estimated."] };
        var thin = HandMadeStages.Result(stages with
        {
            Inference = stages.Inference with
            {
                Covariances = stages.Inference.Covariances.SetItem(CovarianceKind.Jackknife, lost),
                Parameters = [.. stages.Inference.Parameters.Select((p, place) => place == 2
                    ? p with { ByKind = p.ByKind.SetItem(CovarianceKind.Jackknife, new KindFigures(null, null, null, lost.RefusedReasons[0])) }
                    : p)],
            },
        });
        Assert.Null(At(Parse(thin), "covariance.jackknife").EnumerateArray().ElementAt(2).EnumerateArray().First().GetString());
        foreach (var document in new[] { Document, Parse(poor), Parse(thin) })
        {
            var reasons = document.GetProperty("reasons").EnumerateArray().Select(r => r.GetProperty("path").GetString()!).ToHashSet();
            Assert.All(document.GetProperty("reasons").EnumerateArray(), r => Assert.NotEqual("", r.GetProperty("reason").GetString()));
            var missing = Nulls(document, "").Where(p => !p.EndsWith(".alternative", StringComparison.Ordinal) && p != "diagnostics.reason").ToList();
            Assert.NotEmpty(missing);
            Assert.All(missing, path => Assert.True(reasons.Contains(path), "no reason for " + path));
            // And no reason speaks of a figure that is there.
            Assert.Equal(reasons.Count, reasons.Count(missing.Contains));
        }
    }

    [Fact]
    public void Matrices_are_symmetric_over_all_parameters_and_agree_with_the_standard_errors()
    {
        var parameters = Document.GetProperty("parameters").EnumerateArray().ToList();
        foreach (var kind in new[] { "pooled", "outer_product", "robust", "cluster", "jackknife", "bootstrap" })
        {
            var matrix = Document.GetProperty("covariance").GetProperty(kind).EnumerateArray().Select(r => r.EnumerateArray().Select(x => x.GetDouble()).ToArray()).ToArray();
            Assert.Equal(parameters.Count, matrix.Length);
            for (var i = 0; i < matrix.Length; i++)
            {
                Assert.Equal(parameters.Count, matrix[i].Length);
                for (var j = 0; j < i; j++) Assert.Equal(matrix[i][j], matrix[j][i], 1e-12 * (1 + Math.Abs(matrix[i][j])));
                Assert.Equal(parameters[i].GetProperty("se").GetProperty(kind).GetDouble(), Math.Sqrt(matrix[i][i]), 1e-12);
            }
        }
    }

    [Fact]
    public void A_nest_that_shares_another_nests_parameter_repeats_its_figures_and_says_so()
    {
        var land = At(Document, "parameters.6");
        var water = At(Document, "parameters.7");
        Assert.Equal("water", water.GetProperty("name").GetString());
        Assert.Equal("land", water.GetProperty("same_as").GetString());
        foreach (var field in new[] { "kind", "status", "estimate", "se", "interval", "p_value", "se_ratio" })
            Assert.Equal(land.GetProperty(field).GetRawText(), water.GetProperty(field).GetRawText());
    }

    [Fact]
    public void A_nest_that_is_never_wider_than_one_alternative_is_fixed_at_its_parents_value_with_zero_rows()
    {
        var made = SyntheticPanel.Make(3, 20, 6, 4, [SyntheticPanel.Nest("outer", "A", "inner"), SyntheticPanel.Nest("inner", "B")], [0.6, 1]);
        var (model, refitter) = NewtonRefitter.Fit(made.Design(), made.Truth);
        var settings = HandMadeStages.Many.Study.Inference with { Replicates = 0, Jackknife = PanelChoice.Study.JackknifeKind.Off };
        var inference = StandardErrors.Compute(InferenceInput.From(model, refitter), settings, WorkContext.Quiet);
        var result = HandMadeStages.Result(HandMadeStages.Many with
        {
            Study = HandMadeStages.Many.Study with { Nests = made.Nests, Terms = HandMadeStages.Many.Study.Terms[..3], Inference = settings }, Sample = EstimationSample.Of(made.Covariates), Model = model, Inference = inference,
        });
        var (outer, inner) = (result.Parameters[^2], result.Parameters[^1]);
        Assert.Equal(("outer", "free"), (outer.Name, outer.Status));
        Assert.Equal(("inner", "fixed"), (inner.Name, inner.Status));
        Assert.Equal(outer.Estimate, inner.Estimate);
        Assert.Null(inner.StandardErrors.Cluster);
        Assert.All(Enumerable.Range(0, result.Parameters.Length), j => Assert.Equal(0, result.Covariance.Cluster![result.Parameters.Length - 1, j]));
        Assert.Null(result.Jackknife);
        Assert.Equal(new BootstrapCounts(0, 0, 0, []).Requested, result.Bootstrap.Requested);
        Assert.Contains(result.Findings, f => f.Id == "nests.never_wider");
    }

    [Fact]
    public void A_number_reads_back_to_the_same_bits()
    {
        var estimate = At(Document, "parameters.3.estimate").GetDouble();
        Assert.Equal(BitConverter.DoubleToInt64Bits(Result.Parameters[3].Estimate!.Value), BitConverter.DoubleToInt64Bits(estimate));
        Assert.Equal(Result.Covariance.Cluster![1, 2], At(Document, "covariance.cluster").EnumerateArray().ElementAt(1).EnumerateArray().ElementAt(2).GetDouble());
    }

    [Fact]
    public void The_document_is_utf8_without_a_mark_with_line_feeds_and_one_at_the_end()
    {
        var bytes = ResultJson.Bytes(Result with { Title = "Überfahrt \"Süd\"" });
        Assert.Equal((byte)'{', bytes[0]);
        Assert.Equal((byte)'\n', bytes[^1]);
        Assert.DoesNotContain((byte)'\r', bytes);
        Assert.Contains("Überfahrt \\\"Süd\\\"", Encoding.UTF8.GetString(bytes), StringComparison.Ordinal);
    }

    [Fact]
    public void An_estimate_that_is_not_to_be_trusted_has_no_standard_errors_and_says_why()
    {
        var stages = HandMadeStages.Many;
        var model = stages.Model with { Status = FitStatus.Boundary, Findings = [new FitFinding("fit.boundary", "A dissimilarity runs to 0.", [6])] };
        var refused = StandardErrors.Compute(InferenceInput.From(model, new ScriptedRefitter(_ => throw new InvalidOperationException())), stages.Study.Inference, WorkContext.Quiet);
        var diagnostics = HandMadeStages.Taste with { Verdict = Verdict.NotApplicable, Reason = "The estimate is no maximum.", Cause = null, Detector = null, DateScore = null, Lags = [], ByAlternative = [], ByNest = [], VarianceInflation = null, HitRate = null };
        var result = HandMadeStages.Result(stages with { Model = model, Inference = refused, Diagnostics = diagnostics });
        Assert.False(result.IsTrusted);
        Assert.All(result.Parameters, p => Assert.Null(p.StandardErrors.Pooled));
        Assert.Null(result.Covariance.Pooled);
        Assert.Equal((stages.Study.Inference.Replicates, 0), (result.Bootstrap.Requested, result.Bootstrap.Done));
        Assert.Contains(result.Findings, f => f.Id == "fit.untrusted");
        Assert.Contains(result.Findings, f => f.Id == "advice.nothing");
        Assert.DoesNotContain(result.Findings, f => f.Topic == FindingTopic.Past);
        Assert.Equal(["land"], Parse(result).GetProperty("fit").GetProperty("warnings")[0].GetProperty("parameters").EnumerateArray().Select(x => x.GetString()));
    }

    private static JsonElement Parse(AnalysisResult result) => JsonDocument.Parse(ResultJson.Bytes(result)).RootElement;

    private static JsonElement At(JsonElement element, string path)
    {
        foreach (var step in path.Split('.', StringSplitOptions.RemoveEmptyEntries))
            element = element.ValueKind == JsonValueKind.Array ? element[int.Parse(step, System.Globalization.CultureInfo.InvariantCulture)] : element.GetProperty(step);
        return element;
    }

    private static IEnumerable<string> Nulls(JsonElement element, string path) => element.ValueKind switch
    {
        JsonValueKind.Null => [path],
        JsonValueKind.Object => element.EnumerateObject().SelectMany(p => Nulls(p.Value, path.Length == 0 ? p.Name : $"{path}.{p.Name}")),
        JsonValueKind.Array => element.EnumerateArray().SelectMany((x, i) => Nulls(x, $"{path}[{i}]")),
        _ => [],
    };
}
