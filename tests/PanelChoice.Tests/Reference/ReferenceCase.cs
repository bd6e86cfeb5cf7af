using System.Collections.Immutable;
using System.Text.Json;
using PanelChoice.Inference;
using Xunit;

namespace PanelChoice.Tests.Reference;

/// <summary>Expected values of one case, read from <c>fixtures/NAME/expected.json</c>; origin and digits in the README beside it.</summary>
internal sealed class ReferenceCase
{
    private static readonly (CovarianceKind Kind, string Name)[] Kinds =
    [
        (CovarianceKind.Pooled, "classical"), (CovarianceKind.OuterProduct, "opg"), (CovarianceKind.Robust, "sandwich_occasion"),
        (CovarianceKind.Cluster, "cluster_person_cv1"), (CovarianceKind.ClusterUncorrected, "cluster_person_cv0"),
        (CovarianceKind.Jackknife, "jackknife_person_cv3"), (CovarianceKind.TwoWay, "twoway_person_date_factor"),
    ];

    private readonly JsonElement results;

    /// <summary>The cases whose sample and results are described alike.</summary>
    public static readonly string[] DescribedNames =
    [
        "a_modechoice_conditional_logit", "a2_modechoice_weighted", "b_modechoice_nested", "c_union_pooled_dynamic_logit",
        "c2_ohio_pooled_dynamic_logit", "e0_commuter_by_occasion_no_nests", "e_commuter_by_occasion", "e2_commuter_by_occasion_weighted",
        "e3_commuter_three_levels",
    ];

    public static TheoryData<string> Described => [.. DescribedNames];

    /// <summary>The cases of several occasions that persons share, which have expected values clustered two ways.</summary>
    public static TheoryData<string> TwoWay => [.. DescribedNames.Where(n => !n.Contains("modechoice", StringComparison.Ordinal))];

    /// <summary>The kinds of covariance that every case has expected values of.</summary>
    public static IEnumerable<CovarianceKind> CovarianceKinds => Kinds.Select(k => k.Kind).Where(k => k != CovarianceKind.TwoWay);

    private ReferenceCase(JsonElement root)
    {
        Root = root;
        // One case was made by a program of its own and has its results at the top.
        results = root.TryGetProperty("results", out var inner) ? inner : root;
        Parameters = [.. results.GetProperty("parameters").EnumerateArray().Select(p => p.GetString()!)];
    }

    public JsonElement Root { get; }

    /// <summary>Names of the P parameters.</summary>
    public ImmutableArray<string> Parameters { get; }

    public double LogLikelihood => results.GetProperty("loglik").GetDouble();

    public double LogLikelihoodEqualProbability => results.GetProperty("loglik_equal_probabilities").GetDouble();

    public int Occasions => results.GetProperty("n_occasions").GetInt32();

    public int Persons => results.GetProperty("n_persons").GetInt32();

    public static ReferenceCase Read(string name)
    {
        using var document = JsonDocument.Parse(File.ReadAllBytes(Repository.Fixture(name, "expected.json")));
        return new ReferenceCase(document.RootElement.Clone());
    }

    public double Coefficient(string parameter) => results.GetProperty("coefficients").GetProperty(parameter).GetDouble();

    public double StandardError(CovarianceKind kind, string parameter) =>
        results.GetProperty("standard_errors").GetProperty(NameOf(kind)).GetProperty(parameter).GetDouble();

    /// <summary>Parameters whose variance by person and date comes out negative.</summary>
    public ImmutableArray<string> NegativeTwoWay => results.TryGetProperty("negative_variances", out var all) && all.TryGetProperty(NameOf(CovarianceKind.TwoWay), out var names)
        ? [.. names.EnumerateArray().Select(n => n.GetString()!)]
        : [];

    /// <summary>P x P.</summary>
    public double[,] Covariance(CovarianceKind kind)
    {
        var rows = results.GetProperty("covariances").GetProperty(NameOf(kind));
        var matrix = new double[Parameters.Length, Parameters.Length];
        for (var r = 0; r < Parameters.Length; r++)
            for (var c = 0; c < Parameters.Length; c++)
                matrix[r, c] = rows[r][c].GetDouble();
        return matrix;
    }

    private static string NameOf(CovarianceKind kind) => Kinds.Single(k => k.Kind == kind).Name;
}
