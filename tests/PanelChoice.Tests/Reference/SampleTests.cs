using System.Text.Json;
using PanelChoice.Likelihood;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Reference;

/// <summary>
/// From raw columns to the design, against sums and counts from the independent program beside the fixtures (rebuilt a second time in
/// another language: fixtures/AGREEMENT.md).
/// </summary>
public class SampleTests
{
    public static TheoryData<string> Cases => ReferenceCase.Described;

    [Theory]
    [MemberData(nameof(Cases))]
    public void The_sample_is_the_expected_one(string name)
    {
        var (expected, sample) = (ReferenceCase.Read(name), PipelineSample.Of(name));
        Assert.Equal(expected.Occasions, sample.Design.Situations);
        Assert.Equal(expected.Persons, sample.Design.Persons);
        Assert.Equal(expected.Persons, sample.Design.Clusters.Length);
        var counts = expected.Root.GetProperty("sample_counts");
        for (var j = 0; j < sample.Design.Alternatives; j++)
        {
            var count = counts.GetProperty(sample.Design.Tree.Alternatives[j]);
            Assert.Equal(count.GetProperty("available").GetInt32(), Enumerable.Range(0, expected.Occasions).Count(s => sample.Design.IsOffered(s, j)));
            Assert.Equal(count.GetProperty("chosen").GetInt32(), Enumerable.Range(0, expected.Occasions).Count(s => sample.Design.ChosenAt(s) == j));
        }
    }

    [Theory]
    [MemberData(nameof(Cases))]
    public void Covariates_and_lags_built_from_raw_columns_have_the_expected_sums(string name)
    {
        var (expected, design) = (ReferenceCase.Read(name), PipelineSample.Of(name).Design);
        var sums = expected.Root.GetProperty("design_sums").EnumerateObject().ToDictionary(p => p.Name, p => p.Value);
        var agreement = new Agreement(Agreement.SameSum);
        for (var k = 0; k < design.Layout.Coefficients; k++)
        {
            var parameter = PipelineSample.NameOf(design.Layout.Parameters[k], expected);
            var (offered, chosen) = (0.0, 0.0);
            foreach (var column in design.Columns.Where(c => c.Parameter == k))
                for (var s = 0; s < design.Situations; s++)
                {
                    if (!design.IsOffered(s, column.Alternative)) continue;
                    offered += design.Value(s, column);
                    if (design.ChosenAt(s) == column.Alternative) chosen += design.Value(s, column);
                }

            agreement.Compare($"{parameter} over offered rows", Sum(sums[parameter], "sum_available_rows"), offered);
            agreement.Compare($"{parameter} over chosen rows", Sum(sums[parameter], "sum_chosen_rows"), chosen);
        }

        agreement.AssertAll(2 * sums.Count);
    }

    [Theory]
    [MemberData(nameof(Cases))]
    public void The_log_likelihood_at_the_expected_coefficients_is_the_expected_one(string name)
    {
        var (expected, sample) = (ReferenceCase.Read(name), PipelineSample.Of(name));
        var parameters = sample.Design.Layout.Parameters
            .Select(p => p.Fixed ?? expected.Coefficient(PipelineSample.NameOf(p, expected))).ToArray();
        var likelihood = LikelihoodKernel.Create(sample.Design, sample.Study.Estimate.Form, 2);
        var agreement = new Agreement(Agreement.LogLikelihood);
        agreement.Compare("log-likelihood", expected.LogLikelihood, likelihood.Evaluate(parameters, sample.Design.PersonWeight.AsSpan(), Derivatives.None).Value);
        agreement.AssertAll(1);
    }

    private static double Sum(JsonElement sums, string which) => sums.GetProperty(which).GetDouble();
}
