using System.Collections.Concurrent;
using System.Collections.Immutable;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Panels;
using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Reference;

/// <summary>The real stages from the fixture's study file and raw data to the design; each case is read once.</summary>
internal sealed record PipelineSample(StudySpecification Study, CovariateSet Covariates, ChoiceDesign Design)
{
    private static readonly ConcurrentDictionary<string, Lazy<PipelineSample>> Read = new();

    public static PipelineSample Of(string name) => Read.GetOrAdd(name, n => new Lazy<PipelineSample>(() => Build(n))).Value;

    /// <summary>The name that the expected values have for a parameter.</summary>
    public static string NameOf(ModelParameter parameter, ReferenceCase expected) =>
        parameter.Kind == ParameterKind.Dissimilarity
            ? expected.Parameters.Single(n => n == $"lambda_{parameter.Name}" || n == $"tau_{parameter.Name}")
            : parameter.Alternative is null ? parameter.Name : $"{parameter.Name}_{parameter.Alternative}";

    /// <summary>For each free parameter, its place among the expected ones. Every expected parameter must be hit.</summary>
    public ImmutableArray<int> PlacesIn(ReferenceCase expected)
    {
        var places = Design.Layout.Free.Select(k => expected.Parameters.IndexOf(NameOf(Design.Layout.Parameters[k], expected))).ToImmutableArray();
        Assert.Equal(Enumerable.Range(0, expected.Parameters.Length), places.Order());
        return places;
    }

    private static PipelineSample Build(string name)
    {
        var study = Good(StudyFileReader.Read(Repository.Fixture(name, "study.toml")));
        var table = Good(ChoiceTableReader.Read(study));
        var panel = Good(ChoicePanelBuilder.Build(study, table));
        var tree = Good(NestTreeBuilder.Build(study, panel.Alternatives));
        var covariates = Good(CovariateBuilder.Build(study, panel, tree));
        return new PipelineSample(study, covariates, ChoiceDesignBuilder.Build(covariates, tree, study.Nests, study.Estimate.Form));
    }

    private static T Good<T>(Checked<T> read)
        where T : class
    {
        Assert.Empty(read.Problems.Select(p => p.Sentence));
        return read.Value!;
    }
}
