using System.Globalization;
using System.Text.RegularExpressions;
using PanelChoice.Inference;
using Xunit;

namespace PanelChoice.Tests.Reference;

/// <summary>Values printed by programs independent of the reference cases: 60-digit arithmetic (travel mode), double precision (union).</summary>
public class CertifiedTests
{
    [Theory]
    [InlineData("a_modechoice_conditional_logit", "conditional logit logL")]
    [InlineData("b2_modechoice_nested_greene", "nested logit A")]
    [InlineData("b_modechoice_nested", "nested logit B")]
    public void Travel_mode_agrees_with_the_certified_values(string name, string heading)
    {
        var (expected, run) = (ReferenceCase.Read(name), PipelineRun.Of(name));
        var lines = File.ReadAllLines(Repository.Fixture("data", "certified_modechoice.txt"));
        var at = Array.FindIndex(lines, l => l.StartsWith(heading, StringComparison.Ordinal));
        var likelihood = new Agreement(Agreement.LogLikelihood);
        likelihood.Compare("log-likelihood", Figure(lines[at], "logL "), run.Model.LogLikelihood);
        likelihood.AssertAll(1);

        var (coefficients, errors) = (new Agreement(Agreement.Coefficient), new Agreement(Agreement.OtherProgram));
        foreach (var line in lines.Skip(at + 1).TakeWhile(l => l.StartsWith(' ')))
        {
            var certified = line.Split(' ', StringSplitOptions.RemoveEmptyEntries)[0];
            var parameter = expected.Parameters.Single(p => p == certified || p == $"constant_{certified}" || p == $"lambda_{certified}"
                || (certified == "tau_ground" && p == "lambda_ground") || (certified == "hinc_fly" && p == "hinc_air"));
            var place = expected.Parameters.IndexOf(parameter);
            var value = run.Model.Parameters[run.Model.Layout.Free[run.Sample.PlacesIn(expected).IndexOf(place)]];
            double Error(CovarianceKind kind) =>
                certified == "hinc_fly" ? new BranchIncome(run).Figures(kind).Error : run.StandardErrors(kind, expected)[place];
            coefficients.Compare(certified, Figure(line, $"{certified} +"), certified == "hinc_fly" ? new BranchIncome(run).Figures(CovarianceKind.Pooled).Value : value);
            errors.Compare($"pooled {certified}", Figure(line, "se_hess "), Error(CovarianceKind.Pooled));
            errors.Compare($"outer product {certified}", Figure(line, "se_opg "), Error(CovarianceKind.OuterProduct));
            errors.Compare($"robust {certified}", Figure(line, "se_sandwich "), Error(CovarianceKind.Robust));
        }

        coefficients.AssertAll(expected.Parameters.Length);
        errors.AssertAll(3 * expected.Parameters.Length);
    }

    [Fact]
    public void Union_agrees_with_the_certified_values()
    {
        var run = PipelineRun.Of("c_union_certified");
        var lines = File.ReadAllLines(Repository.Fixture("c_union_certified", "certified.txt"));
        var likelihood = new Agreement(Agreement.LogLikelihood);
        likelihood.Compare("log-likelihood", Figure(lines[0], "logL "), run.Model.LogLikelihood);
        likelihood.AssertAll(1);
        Assert.Equal((3815, 545), (run.Sample.Design.Situations, run.Sample.Design.Persons));

        // Printed to nine decimals, so the comparison is to half a unit of the last one.
        const double Printed = 0.5000001e-9;
        foreach (var (name, line) in lines.Skip(1).Take(5).Select(l => (l.Split(' ')[0], l)))
        {
            var free = run.Model.Layout.Free.Select(k => run.Model.Layout.Parameters[k].Name).ToList().IndexOf(name);
            Assert.Equal(Figure(line, "est="), run.Model.Parameters[run.Model.Layout.Free[free]], Printed);
            foreach (var (kind, label) in new[]
            {
                (CovarianceKind.Pooled, "hess="), (CovarianceKind.Robust, "obs-robust="), (CovarianceKind.ClusterUncorrected, " CV0="),
                (CovarianceKind.Cluster, @"CV1 G/\(G-1\)="), (CovarianceKind.Jackknife, " CV3="),
            })
                Assert.Equal(Figure(line, label), run.Inference.Parameters[free].ByKind[kind].StandardError!.Value, Printed);
        }
    }

    [Fact]
    public void Union_has_the_printed_one_step_jackknife_effective_clusters_and_leverage()
    {
        var run = PipelineRun.Of("c_union_certified");
        var lines = File.ReadAllLines(Repository.Fixture("c_union_certified", "certified.txt"));
        var input = InferenceInput.From(run.Model, new PanelChoice.Estimation.ClusterRefitter(run.Model, 2));
        var step = StandardErrors.Compute(
            input, run.Sample.Study.Inference with { Jackknife = PanelChoice.Study.JackknifeKind.OneStep }, PanelChoice.Numerics.WorkContext.Quiet);
        foreach (var (name, line, effective) in lines.Skip(1).Take(5).Zip(lines.Skip(6).Take(5), (l, e) => (l.Split(' ')[0], l, e)))
        {
            var free = run.Model.Layout.Free.Select(k => run.Model.Layout.Parameters[k].Name).ToList().IndexOf(name);
            Assert.Equal(Figure(line, "CV3lin="), step.Parameters[free].ByKind[CovarianceKind.Jackknife].StandardError!.Value, 0.5000001e-9);
            // Printed to one decimal.
            Assert.Equal(Figure(effective, @"G\*\(0\) "), run.Inference.Parameters[free].Leverage!.Effective, 0.0500001);
            var adjusted = run.Inference.Parameters[free].ByKind[CovarianceKind.BiasReduced].StandardError!.Value;
            Assert.InRange(adjusted, Figure(line, " CV0="), Figure(line, " CV3="));
        }

        var leverage = lines.Single(l => l.StartsWith("cluster leverage", StringComparison.Ordinal));
        Assert.Equal(Figure(leverage, "max/mean "), run.Inference.Clusters.LargestLeverage!.Value / (11.0 / 545), 0.0005001);
    }

    private static double Figure(string line, string before) =>
        double.Parse(Regex.Match(line, before + @"(-?[0-9.]+)").Groups[1].Value, CultureInfo.InvariantCulture);
}
