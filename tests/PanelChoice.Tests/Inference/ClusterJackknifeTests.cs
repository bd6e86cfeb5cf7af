using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Numerics;
using PanelChoice.Study;
using Xunit;
using static PanelChoice.Tests.Inference.PanelSurgery;

namespace PanelChoice.Tests.Inference;

public class ClusterJackknifeTests
{
    private const double SameMethod = 1e-8;

    [Fact]
    public void Refits_equal_fresh_fits_on_panels_without_the_person()
    {
        const int Persons = 14;
        var made = Small(21, Persons, 8);
        var design = made.Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var result = StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(JackknifeKind.Auto), WorkContext.Quiet);

        var k = design.Layout.Count;
        var sum = Matrix<double>.Build.Dense(k, k);
        for (var g = 0; g < Persons; g++)
        {
            var without = made.Pick([.. Enumerable.Range(0, Persons).Where(p => p != g)]).Design();
            var (fresh, _) = NewtonRefitter.Fit(without, without.PlainStart());
            var deviation = Vector<double>.Build.Dense(k, p => fresh.Parameters[p] - model.Parameters[p]);
            sum += deviation.OuterProduct(deviation);
            for (var p = 0; p < k; p++)
                Assert.InRange(Math.Abs(result.Jackknife!.Deviations[(g * k) + p] - deviation[p]), 0, SameMethod);
        }

        var expected = sum * (Persons - 1) / Persons;
        var actual = result.Covariances[CovarianceKind.Jackknife];
        Assert.Equal((JackknifeKind.Refit, Persons, 0), (result.Jackknife!.Kind, result.Jackknife.Refits, result.Jackknife.Failures));
        Assert.Equal(((Persons - 1.0) / Persons, Persons - 1.0), (actual.Factor, actual.DegreesOfFreedom!.Value));
        for (var r = 0; r < k; r++)
            for (var c = 0; c < k; c++)
                Assert.InRange(Math.Abs(actual.Matrix![r, c] - expected[r, c]), 0, SameMethod * Math.Sqrt(expected[r, r] * expected[c, c]));
        Assert.All(result.Parameters, p => Assert.InRange(
            p.JackknifeSeRatio!.Value, 0.999999 * p.ByKind[CovarianceKind.Jackknife].StandardError!.Value / p.ByKind[CovarianceKind.Pooled].StandardError!.Value,
            1.000001 * p.ByKind[CovarianceKind.Jackknife].StandardError!.Value / p.ByKind[CovarianceKind.Pooled].StandardError!.Value));
    }

    [Fact]
    public void One_step_equals_its_formula_and_comes_near_the_refits()
    {
        var design = Small(22, 40, 8).Weighted(p => 1 + (0.5 * (p % 2))).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var input = InferenceInput.From(model, refitter);
        var step = StandardErrors.Compute(input, Settings(JackknifeKind.OneStep), WorkContext.Quiet);
        var k = design.Layout.Count;
        var scores = Matrix<double>.Build.DenseOfRowMajor(design.Situations, k, model.Likelihood.Scores(model.Parameters.AsSpan()));
        var persons = model.Likelihood.PersonInformation(model.Parameters.AsSpan());
        var sum = Matrix<double>.Build.Dense(k, k);
        for (var g = 0; g < 40; g++)
        {
            var without = Matrix<double>.Build.Dense(k, k);
            for (var p = 0; p < 40; p++)
                if (p != g) without += design.PersonWeight[p] * Matrix<double>.Build.DenseOfRowMajor(k, k, persons.AsSpan(p * k * k, k * k).ToArray());
            var deviation = -without.Solve(design.PersonWeight[g] * scores.SubMatrix(g * 8, 8, 0, k).ColumnSums());
            sum += deviation.OuterProduct(deviation);
            for (var p = 0; p < k; p++)
                Assert.InRange(Math.Abs(step.Jackknife!.Deviations[(g * k) + p] - deviation[p]), 0, SameMethod * Math.Max(1, Math.Abs(deviation[p])));
        }

        Assert.Equal(JackknifeKind.OneStep, step.Jackknife!.Kind);
        Assert.Contains(step.Covariances[CovarianceKind.Jackknife].Cautions, c => c.Contains("One Newton step", StringComparison.Ordinal));
        var full = StandardErrors.Compute(input, Settings(JackknifeKind.Refit), WorkContext.Quiet);
        for (var p = 0; p < k; p++)
        {
            var stepped = Math.Sqrt(step.Covariances[CovarianceKind.Jackknife].Matrix![p, p]);
            Assert.InRange(stepped / Math.Sqrt(39.0 / 40 * sum[p, p]), 1 - SameMethod, 1 + SameMethod);
            Assert.InRange(stepped / Math.Sqrt(full.Covariances[CovarianceKind.Jackknife].Matrix![p, p]), 0.8, 1.25);
        }
    }

    [Fact]
    public void In_a_linear_model_refits_one_step_and_the_hat_matrix_form_are_the_same()
    {
        // Hat-matrix form: sum over g of H^-1 X_g' (I - X_g H^-1 X_g')^-1 e_g (Bell and McCaffrey 2002).
        var toy = new LinearToy(23, 15, g => 2 + (g % 5));
        var refit = StandardErrors.Compute(toy.Input(), Settings(JackknifeKind.Refit), WorkContext.Quiet).Jackknife!;
        var step = StandardErrors.Compute(toy.Input(), Settings(JackknifeKind.OneStep), WorkContext.Quiet).Jackknife!;
        var bread = (toy.X.Transpose() * toy.X).Inverse();
        var e = toy.Y - (toy.X * toy.Estimate(_ => 1));
        for (var g = 0; g < 15; g++)
        {
            var x = toy.Rows(g);
            var residual = e.SubVector(toy.ClusterOf.IndexOf(g), x.RowCount);
            var hat = Matrix<double>.Build.DenseIdentity(x.RowCount) - (x * bread * x.Transpose());
            var deviation = -(bread * x.Transpose() * hat.Solve(residual));
            for (var p = 0; p < 3; p++)
            {
                Assert.InRange(Math.Abs(refit.Deviations[(g * 3) + p] - deviation[p]), 0, 1e-12);
                Assert.InRange(Math.Abs(step.Deviations[(g * 3) + p] - deviation[p]), 0, 1e-12);
            }
        }
    }

    [Fact]
    public void With_fewer_than_forty_clusters_the_one_step_form_is_refused_and_its_changes_are_still_told()
    {
        var result = StandardErrors.Compute(new LinearToy(27, 39, _ => 2).Input(), Settings(JackknifeKind.OneStep), WorkContext.Quiet);
        Assert.Contains("no substitute for refits with 39 clusters", result.Covariances[CovarianceKind.Jackknife].Refusal, StringComparison.Ordinal);
        Assert.Equal(JackknifeKind.OneStep, result.Clusters.InfluenceFrom);
        Assert.NotNull(StandardErrors.Compute(new LinearToy(27, 40, _ => 2).Input(), Settings(JackknifeKind.OneStep), WorkContext.Quiet).Covariances[CovarianceKind.Jackknife].Matrix);
    }

    [Fact]
    public void Beyond_a_thousand_clusters_those_without_which_no_step_exists_are_refitted()
    {
        // One cluster alone carries the last column: without it nothing is left of the column's information.
        var toy = new LinearToy(28, 1001, _ => 1);
        var input = toy.Input();
        var changed = input with
        {
            ClusterInformation = (first, count) =>
            {
                var parts = input.ClusterInformation(first, count).ToArray();
                if (first <= 500 && first + count > 500) input.Information.CopyTo(parts, (500 - first) * 9);
                return [.. parts];
            },
        };
        var step = StandardErrors.Compute(changed, Settings(JackknifeKind.Auto), WorkContext.Quiet);
        Assert.Equal((JackknifeKind.OneStep, 1, 0), (step.Jackknife!.Kind, step.Jackknife.Refitted, step.Jackknife.Failures));
        Assert.Contains(step.Covariances[CovarianceKind.Jackknife].Cautions, c => c.Contains("full refits were made there", StringComparison.Ordinal));
        // In a linear model a step is the refit, so that nothing else changes.
        var plain = StandardErrors.Compute(input, Settings(JackknifeKind.Auto), WorkContext.Quiet);
        Assert.True(plain.Jackknife!.Deviations.Zip(step.Jackknife.Deviations).All(x => Math.Abs(x.First - x.Second) < 1e-10));
        Assert.NotNull(StandardErrors.Compute(changed, Settings(JackknifeKind.OneStep), WorkContext.Quiet).Covariances[CovarianceKind.Jackknife].Refusal);
    }

    [Theory]
    [InlineData(1000, JackknifeKind.Refit)]
    [InlineData(1001, JackknifeKind.OneStep)]
    public void Auto_refits_up_to_a_thousand_clusters_and_steps_beyond(int clusters, JackknifeKind expected)
    {
        var input = new LinearToy(24, clusters, _ => 1).Input();
        var scripted = input with { Refitter = new ScriptedRefitter(_ => ScriptedRefitter.Converged(1.1, 0, 1)) };
        var result = StandardErrors.Compute(scripted, Settings(JackknifeKind.Auto), WorkContext.Quiet);
        Assert.Equal((expected, clusters), (result.Jackknife!.Kind, result.Jackknife.Refits));
    }

    [Fact]
    public void A_term_lost_without_one_person_is_refused_with_that_person_named_and_the_others_stay()
    {
        const int Persons = 12;
        var design = Small(25, Persons, 8).WithTicket(2, 4).Design();
        var (model, refitter) = NewtonRefitter.Fit(design, design.PlainStart());
        var result = StandardErrors.Compute(InferenceInput.From(model, refitter), Settings(JackknifeKind.Auto), WorkContext.Quiet);
        var ticket = Enumerable.Range(0, design.Layout.Count).Single(p => design.Layout.Parameters[p].Name == "ticket");
        var place = design.Layout.Free.IndexOf(ticket);
        var covariance = result.Covariances[CovarianceKind.Jackknife];
        Assert.Equal([place], covariance.RefusedParameters.ToArray());
        Assert.Contains("Without person 5 'ticket [C]'", covariance.RefusedReasons[0], StringComparison.Ordinal);
        Assert.Equal(covariance.RefusedReasons[0], result.Parameters[place].ByKind[CovarianceKind.Jackknife].Reason);
        Assert.Null(result.Parameters[place].ByKind[CovarianceKind.Jackknife].StandardError);
        Assert.Equal(1, result.Jackknife!.Failures);

        // Only the name that was handed over is in any sentence, so that ids can be masked.
        var masked = StandardErrors.Compute(
            InferenceInput.From(model, refitter, [.. Enumerable.Range(0, Persons).Select(g => $"c{g}")]), Settings(JackknifeKind.Auto), WorkContext.Quiet);
        Assert.StartsWith("Without person c4 ", masked.Covariances[CovarianceKind.Jackknife].RefusedReasons[0], StringComparison.Ordinal);

        // The dummy is 0 for everybody else, so that the others' figures are those of a model without it.
        var f = design.Layout.Free.Length;
        var without = Small(25, Persons, 8).Pick([.. Enumerable.Range(0, Persons).Where(p => p != 4)]).Design();
        var (fresh, _) = NewtonRefitter.Fit(without, without.PlainStart());
        foreach (var (p, i) in design.Layout.Free.Where(p => p != ticket).Select((p, i) => (p, i)))
        {
            Assert.NotNull(result.Parameters[design.Layout.Free.IndexOf(p)].ByKind[CovarianceKind.Jackknife].StandardError);
            var deviation = result.Jackknife.Deviations[(4 * f) + design.Layout.Free.IndexOf(p)];
            Assert.InRange(Math.Abs(deviation - (fresh.Parameters[i] - model.Parameters[p])), 0, SameMethod);
        }

        Assert.True(double.IsNaN(result.Jackknife.Deviations[(4 * f) + place]));
        for (var c = 0; c < f; c++) Assert.Equal(c == place, double.IsNaN(covariance.Matrix![0, c]));
    }

    [Fact]
    public void Terms_that_cannot_be_told_apart_without_a_cluster_are_lost_together_and_one_is_held()
    {
        var input = new LinearToy(26, 6, _ => 3).Input();
        var scripted = new ScriptedRefitter(r => r.ClusterWeight[3] > 0 || r.Held.SequenceEqual([2])
            ? ScriptedRefitter.Converged(1, 0.5, input.Estimates[2])
            : ScriptedRefitter.Failed(FitStatus.NotIdentified, 1, 2));
        var result = StandardErrors.Compute(input with { Refitter = scripted }, Settings(JackknifeKind.Refit), WorkContext.Quiet);
        Assert.Equal([1, 2], result.Covariances[CovarianceKind.Jackknife].RefusedParameters.ToArray());
        Assert.Equal(7, scripted.Asked.Count);
        Assert.Equal(input.Estimates.ToArray(), scripted.Asked[^1].Start.ToArray());
        Assert.NotNull(result.Parameters[0].ByKind[CovarianceKind.Jackknife].StandardError);
        Assert.All(result.Covariances[CovarianceKind.Jackknife].RefusedReasons, s => Assert.StartsWith("Without person 4 ", s, StringComparison.Ordinal));
    }

    [Fact]
    public void A_refit_that_fails_for_no_named_term_refuses_the_whole_jackknife_and_names_the_person()
    {
        var input = new LinearToy(27, 6, _ => 3).Input();
        var scripted = new ScriptedRefitter(r => r.ClusterWeight[1] > 0 && r.ClusterWeight[4] > 0
            ? ScriptedRefitter.Converged(1, 0.5, 1)
            : ScriptedRefitter.Failed(FitStatus.Stopped));
        var result = StandardErrors.Compute(input with { Refitter = scripted }, Settings(JackknifeKind.Refit), WorkContext.Quiet);
        Assert.Equal("The refit without person 2 (and 1 more) failed: not converged.", result.Covariances[CovarianceKind.Jackknife].Refusal);
        Assert.Equal(2, result.Jackknife!.Failures);
        Assert.All(Enumerable.Range(0, 3), k => Assert.True(double.IsNaN(result.Jackknife.Deviations[3 + k])));
        Assert.DoesNotContain(result.Clusters.MostInfluential, i => i.Cluster is 1 or 4);
    }

    [Fact]
    public void A_one_step_without_enough_information_left_is_refused_and_names_person_and_term()
    {
        var input = new LinearToy(28, 42, _ => 3).Input();
        var parts = input.ClusterInformation(0, 42).ToArray();
        // Person 3 holds all the information on x2.
        for (var g = 0; g < 42; g++)
            for (var i = 0; i < 3; i++) parts[(g * 9) + 6 + i] = parts[(g * 9) + (i * 3) + 2] = g == 2 && i == 2 ? 10 : 0;
        var whole = Enumerable.Range(0, 9).Select(i => Enumerable.Range(0, 42).Sum(g => parts[(g * 9) + i]));
        var result = StandardErrors.Compute(
            input with { Information = [.. whole], ClusterInformation = (_, _) => [.. parts] }, Settings(JackknifeKind.OneStep), WorkContext.Quiet);
        Assert.Contains("without person 3 ", result.Covariances[CovarianceKind.Jackknife].Refusal, StringComparison.Ordinal);
        Assert.Contains("'x2'", result.Covariances[CovarianceKind.Jackknife].Refusal, StringComparison.Ordinal);
        Assert.Equal(1, result.Jackknife!.Failures);
    }

    [Fact]
    public void The_most_influential_are_ten_clusters_by_change_in_clustered_standard_errors()
    {
        var input = new LinearToy(29, 30, g => 2 + (g % 6)).Input();
        var result = StandardErrors.Compute(input, Settings(JackknifeKind.Refit), WorkContext.Quiet);
        var se = result.Parameters.Select(p => p.ByKind[CovarianceKind.Cluster].StandardError!.Value).ToArray();
        var deviations = result.Jackknife!.Deviations;
        var expected = Enumerable.Range(0, 30)
            .Select(g => (g, k: Enumerable.Range(0, 3).MaxBy(k => Math.Abs(deviations[(g * 3) + k]) / se[k])))
            .OrderByDescending(x => Math.Abs(deviations[(x.g * 3) + x.k]) / se[x.k]).Take(10);
        Assert.Equal(expected.Select(x => new Influence(x.g, x.k, deviations[(x.g * 3) + x.k])), result.Clusters.MostInfluential);
    }

    [Fact]
    public void Off_means_off_and_cancelling_stops()
    {
        var input = new LinearToy(30, 10, _ => 3).Input();
        var off = StandardErrors.Compute(input, Settings(), WorkContext.Quiet);
        Assert.Null(off.Jackknife);
        Assert.Contains("switched off", off.Covariances[CovarianceKind.Jackknife].Refusal, StringComparison.Ordinal);
        Assert.Equal(JackknifeKind.OneStep, off.Clusters.InfluenceFrom);
        using var cancelled = new CancellationTokenSource();
        cancelled.Cancel();
        var work = new WorkContext(1, null, cancelled.Token);
        Assert.Throws<OperationCanceledException>(() => StandardErrors.Compute(input, Settings(JackknifeKind.Refit), work));
        Assert.Throws<OperationCanceledException>(() => StandardErrors.Compute(input, Settings(JackknifeKind.OneStep), work));
        Assert.Throws<OperationCanceledException>(() => StandardErrors.Compute(input, Settings(replicates: 10), work));
    }

    [Fact]
    public void Progress_runs_from_nothing_to_all_of_each_long_step()
    {
        var seen = new Recorder();
        StandardErrors.Compute(new LinearToy(31, 40, _ => 3).Input(), Settings(JackknifeKind.Refit, 50), new WorkContext(1, seen, CancellationToken.None));
        foreach (var (step, total) in new[] { ("jackknife", 40L), ("bootstrap replicates", 50L) })
        {
            var reports = seen.Reports.Where(r => r.Step == step).ToList();
            Assert.Equal((0, total), (reports[0].Done, reports[^1].Done));
            Assert.All(reports, r => Assert.Equal(total, r.Total));
            Assert.Equal(reports.Select(r => r.Done).Order(), reports.Select(r => r.Done));
            Assert.True(reports.Count > 2);
        }
    }

    private sealed class Recorder : IProgress<WorkProgress>
    {
        public List<WorkProgress> Reports { get; } = [];

        public void Report(WorkProgress value) => Reports.Add(value);
    }
}
