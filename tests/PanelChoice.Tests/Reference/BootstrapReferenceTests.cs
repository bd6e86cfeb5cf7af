using System.Globalization;
using System.Text.Json;
using Xunit;
using Xunit.Abstractions;

namespace PanelChoice.Tests.Reference;

/// <summary>
/// Bootstrap by person of the nested commuter case against 2,000 replicates of an independent program (scripts beside the fixtures). Two
/// bootstraps agree only up to their Monte-Carlo errors.
/// </summary>
public class BootstrapReferenceTests(ITestOutputHelper output)
{
    [Fact]
    public void Standard_errors_lie_within_four_combined_monte_carlo_errors()
    {
        const string Name = "e_commuter_by_occasion";
        var (expected, run) = (ReferenceCase.Read(Name), PipelineRun.WithBootstrap(Name));
        using var document = JsonDocument.Parse(File.ReadAllBytes(Repository.Fixture(Name, "bootstrap.json")));
        var errors = document.RootElement.GetProperty("standard_error");
        var simulation = document.RootElement.GetProperty("monte_carlo_error_of_standard_error");
        Assert.Equal(399, run.Inference.Bootstrap!.Done);
        var places = run.Sample.PlacesIn(expected);
        var far = new List<string>();
        for (var f = 0; f < places.Length; f++)
        {
            var parameter = expected.Parameters[places[f]];
            var figures = run.Inference.Parameters[f];
            var ours = figures.ByKind[PanelChoice.Inference.CovarianceKind.Bootstrap].StandardError!.Value;
            var (theirs, theirError) = (errors.GetProperty(parameter).GetDouble(), simulation.GetProperty(parameter).GetDouble());
            var z = (ours - theirs) / Math.Sqrt((figures.BootstrapError!.Value * figures.BootstrapError.Value) + (theirError * theirError));
            var line = string.Create(CultureInfo.InvariantCulture, $"{parameter}: expected {theirs:R}, got {ours:R}, {z:0.00} combined Monte-Carlo errors");
            output.WriteLine(line);
            if (!(Math.Abs(z) <= 4)) far.Add(line);
        }

        Assert.True(far.Count == 0, string.Join("\n", far));
    }
}
