using System.Security.Cryptography;
using System.Text;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Diagnostics;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Simulation;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Simulation;

/// <summary>The demonstration panels: fixed, sound, and telling what they were made to tell.</summary>
public sealed class DemoPanelTests(DemoPanelTests.Runs runs) : IClassFixture<DemoPanelTests.Runs>
{
    [Fact]
    public void The_files_are_the_same_bytes_every_time()
    {
        var again = DemoPanel.Files();
        Assert.Equal(runs.Files.Select(f => f.Name), again.Select(f => f.Name));
        Assert.Equal(runs.Files.Select(f => f.Text), again.Select(f => f.Text));
        Assert.Equal(
            [
                ("marrowick-habit.csv", "285e85b123e1ddff"),
                ("marrowick-quiet.csv", "fdf5f99787e1b5e9"),
            ],
            again.Where(f => !f.IsStudy).Select(f => (f.Name, Convert.ToHexStringLower(SHA256.HashData(Encoding.UTF8.GetBytes(f.Text)))[..16])));
        Assert.All(again, f => Assert.DoesNotContain('\r', f.Text));
    }

    [Fact]
    public void Both_panels_show_the_same_people_on_the_same_days_before_the_same_choice_sets()
    {
        string[] WithoutChoice(string name) =>
            [.. runs.Files.Single(f => f.Name == name).Text.Split('\n').Select(l => string.Join(',', l.Split(',').Where((_, i) => i != 4)))];
        Assert.Equal(WithoutChoice("marrowick-habit.csv"), WithoutChoice("marrowick-quiet.csv"));
    }

    [Theory]
    [InlineData("habit")]
    [InlineData("quiet")]
    public void A_panel_has_persons_workdays_modes_nests_gaps_and_unavailable_modes(string name)
    {
        var run = runs.Of(name);
        var panel = run.Panel;
        Assert.Equal(DemoTruth.Modes.AsEnumerable(), panel.Alternatives);
        Assert.Equal(160, panel.Persons.Length);
        Assert.Equal(34, panel.Occasion.Distinct().Count());
        Assert.All(panel.Occasion.Distinct(), d => Assert.True(new WorkingCalendar([DemoTown.Holiday]).IsWorkingDay(d)));
        Assert.Equal(2, run.Study.Nests.Length);

        var used = run.Covariates.Used;
        Assert.InRange(used.Length, 3800, 4300);
        Assert.InRange(run.Covariates.LeftOut.Single(l => l.Reason.StartsWith("no history", StringComparison.Ordinal)).Occasions, 200, 600);
        Assert.Contains(run.Covariates.LeftOut, l => l.Reason == "only one alternative offered");
        for (var j = 0; j < 5; j++)
        {
            Assert.InRange(used.Count(o => panel.Chosen[o] == j) / (double)used.Length, 0.05, 0.5);
            var offered = used.Count(o => panel.Offered[(o * 5) + j]);
            if (DemoTruth.Modes[j] != "bus") Assert.InRange(offered, used.Length * 2 / 5, used.Length - 50);
        }

        var switchers = Enumerable.Range(0, 160).Count(p => panel.Chosen[panel.PersonStart[p]..panel.PersonStart[p + 1]].Distinct().Count() > 1);
        Assert.InRange(switchers, 120, 160);
        Assert.Empty(run.Covariates.Cautions);
    }

    [Fact]
    public void Without_habit_and_tastes_every_true_parameter_is_recovered_and_nothing_is_flagged()
    {
        var run = runs.Of("quiet");
        Assert.Equal(FitStatus.Converged, run.Model.Status);
        Assert.Equal(DemoTruth.Quiet.ByLabel.Keys.Order(), run.Model.Layout.Parameters.Select(p => p.Label).Order());
        Assert.All(run.Errors(DemoTruth.Quiet), e => Assert.InRange(Math.Abs(e.Z), 0, 4));
        Assert.Equal(Verdict.NoneFound, run.Diagnostics.Verdict);
        var ratios = run.Inference.Parameters.Select(p => p.SeRatio!.Value).Order().ToArray();
        Assert.InRange(ratios[ratios.Length / 2], 0.85, 1.15);
    }

    [Fact]
    public void With_lasting_tastes_the_habit_is_overstated_the_pooled_errors_are_too_small_and_the_verdict_names_the_cause()
    {
        var run = runs.Of("habit");
        Assert.Equal(FitStatus.Converged, run.Model.Status);
        Assert.InRange(run.Errors(DemoTruth.Habitual).Single(e => e.Label == "same as yesterday").Z, 4, 30);
        Assert.Equal(Verdict.Dependence, run.Diagnostics.Verdict);
        Assert.Equal(DependenceCause.HabitAndTaste, run.Diagnostics.Cause);
        Assert.False(run.Diagnostics.CommonDays);
        var ratios = run.Inference.Parameters.Select(p => p.SeRatio!.Value).Order().ToArray();
        Assert.InRange(ratios[ratios.Length / 2], 1.3, 2.5);
    }

    /// <summary>A panel read, built and fitted from its files, as a user's would be.</summary>
    internal sealed record Run(
        StudySpecification Study, ChoicePanel Panel, CovariateSet Covariates, FittedModel Model, InferenceResult Inference, DiagnosticsResult Diagnostics)
    {
        /// <summary>Each estimate's distance from the truth in clustered standard errors.</summary>
        public IEnumerable<(string Label, double Z)> Errors(DemoTruth truth) => Inference.Parameters.Select(p =>
        {
            var label = Model.Layout.Parameters[p.Parameter].Label;
            return (label, (Model.Parameters[p.Parameter] - truth.ByLabel[label]) / p.ByKind[CovarianceKind.Cluster].StandardError!.Value);
        });
    }

    /// <summary>Both runs, made once for all tests.</summary>
    public sealed class Runs : IDisposable
    {
        private readonly TemporaryFolder folder = new();
        private readonly Dictionary<string, Run> made = [];

        /// <summary>The files of the demonstration.</summary>
        public IReadOnlyList<DemoFile> Files { get; } = DemoPanel.Files();

        public void Dispose() => folder.Dispose();

        internal Run Of(string name)
        {
            if (made.TryGetValue(name, out var run)) return run;
            foreach (var file in Files) folder.Write(file.Name, file.Text);
            return made[name] = Make(folder.PathOf($"marrowick-{name}.toml"));
        }

        private static Run Make(string path)
        {
            var work = new WorkContext(2, null, CancellationToken.None);
            var study = Sound(StudyFileReader.Read(path));
            var panel = Sound(ChoicePanelBuilder.Build(study, Sound(ChoiceTableReader.Read(study))));
            var tree = Sound(NestTreeBuilder.Build(study, panel.Alternatives));
            var covariates = Sound(CovariateBuilder.Build(study, panel, tree));
            var design = ChoiceDesignBuilder.Build(covariates, tree, study.Nests, study.Estimate.Form);
            var model = MaximumLikelihood.Fit(LikelihoodKernel.Create(design, study.Estimate.Form, 2), study.Estimate.Form, study.Estimate with { Starts = 2 }, work);
            var inference = StandardErrors.Compute(
                InferenceInput.From(model, new ClusterRefitter(model, 2)), study.Inference with { Replicates = 0, Jackknife = JackknifeKind.Off }, work);
            return new Run(study, panel, covariates, model, inference, IndependenceBattery.Run(study, covariates, model, work));
        }

        private static T Sound<T>(Checked<T> stage)
            where T : class
        {
            Assert.Empty(stage.Problems.Select(p => p.Sentence));
            return stage.Value!;
        }
    }
}
