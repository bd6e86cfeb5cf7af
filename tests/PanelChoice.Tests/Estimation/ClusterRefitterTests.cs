using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

public class ClusterRefitterTests
{
    private const double SameMethod = 1e-8;

    private static readonly SyntheticPanel Made = SyntheticPanel.Make(
        21, 30, 8, 4, [SyntheticPanel.Nest("one", "A", "B"), SyntheticPanel.Nest("two", "C", "D")], [0.6, 0.7], habit: 0.5);

    private static readonly FittedModel Model = Fits.Fit(Made, starts: 4);

    [Fact]
    public void Leaving_out_a_cluster_equals_a_fresh_fit_without_its_persons()
    {
        var left = new[] { 0, 13, 29 };
        var outcomes = new ClusterRefitter(Model, 1).Refit([.. left.Select(g => Request(Without(g)))], CancellationToken.None);
        for (var i = 0; i < left.Length; i++)
        {
            var fresh = Fits.Fit(Fits.Persons(Made, [.. Enumerable.Range(0, 30).Where(p => p != left[i])]), NestedLogitForm.UtilityScaled, 1);
            Assert.Equal(FitStatus.Converged, outcomes[i].Status);
            Assert.False(outcomes[i].Retried);
            Assert.Null(outcomes[i].FailureKind);
            Assert.InRange(outcomes[i].Iterations, 1, 5);
            AssertClose(fresh.Parameters, outcomes[i].Parameters);
            Assert.Equal(fresh.LogLikelihood, outcomes[i].LogLikelihood, 9);
        }
    }

    [Fact]
    public void Whole_weights_equal_a_panel_of_cloned_persons()
    {
        var random = new CounterRandom(3, "test weights", 0);
        var weight = new double[30];
        for (var i = 0; i < 30; i++) weight[random.Next(30)]++;
        var outcome = new ClusterRefitter(Model, 1).Refit([Request([.. weight])], CancellationToken.None)[0];
        var copies = Enumerable.Range(0, 30).SelectMany(p => Enumerable.Repeat(p, (int)weight[p])).ToArray();
        var fresh = Fits.Fit(Fits.Persons(Made, copies), NestedLogitForm.UtilityScaled, 1);
        Assert.Equal(FitStatus.Converged, outcome.Status);
        AssertClose(fresh.Parameters, outcome.Parameters);
    }

    [Fact]
    public void Cluster_weights_multiply_sampling_weights()
    {
        var sampling = Enumerable.Range(0, 30).Select(p => 0.5 + (p % 4)).ToArray();
        var weighted = Fits.Fit(Made.Design() with { PersonWeight = [.. sampling] }, NestedLogitForm.UtilityScaled, 1);
        var outcome = new ClusterRefitter(weighted, 1).Refit([Request(Without(4))], CancellationToken.None)[0];
        var both = Made.Design() with { PersonWeight = [.. sampling.Select((w, p) => p == 4 ? 0 : w)] };
        AssertClose(Fits.Fit(both, NestedLogitForm.UtilityScaled, 1).Parameters, outcome.Parameters);
    }

    [Fact]
    public void Outcomes_have_the_same_bits_for_any_number_of_threads_and_any_batch()
    {
        ImmutableArray<RefitRequest> batch = [.. Enumerable.Range(0, 12).Select(g => Request(Without(g)))];
        var one = new ClusterRefitter(Model, 1).Refit(batch, CancellationToken.None);
        var two = new ClusterRefitter(Model, 2).Refit(batch, CancellationToken.None);
        for (var i = 0; i < batch.Length; i++)
        {
            var alone = new ClusterRefitter(Model, 2).Refit([batch[i]], CancellationToken.None)[0];
            Assert.Equal(one[i].Parameters.ToArray(), two[i].Parameters.ToArray());
            Assert.Equal(one[i].Parameters.ToArray(), alone.Parameters.ToArray());
            Assert.Equal(one[i].LogLikelihood, two[i].LogLikelihood);
        }
    }

    [Fact]
    public void Held_parameters_stay_where_the_request_puts_them()
    {
        var start = Model.Parameters.SetItem(3, 0).SetItem(6, 1);
        var outcome = new ClusterRefitter(Model, 1).Refit([new RefitRequest(All(1), start, [3, 6])], CancellationToken.None)[0];
        Assert.Equal(FitStatus.Converged, outcome.Status);
        Assert.Equal(0, outcome.Parameters[3]);
        Assert.Equal(1, outcome.Parameters[6]);
        var gradient = Model.Likelihood.Evaluate(outcome.Parameters.AsSpan(), Model.Design.PersonWeight.AsSpan(), Derivatives.Gradient).Gradient;
        foreach (var k in Model.Layout.Free.Where(k => k is not 3 and not 6)) Assert.InRange(Math.Abs(gradient[k]), 0, 1e-6);
        Assert.True(outcome.LogLikelihood < Model.LogLikelihood);
    }

    [Fact]
    public void A_column_that_vanishes_with_a_cluster_is_found_as_not_identified()
    {
        var made = Fits.Add(Made, Fits.Shared(Made, "visitor's card", (o, j) => o / 8 == 5 && (o + j) % 3 == 0 ? 1 : 0));
        var model = Fits.Fit(made, starts: 1);
        Assert.Equal(FitStatus.Converged, model.Status);
        var place = Enumerable.Range(0, model.Layout.Count).Single(k => model.Layout.Parameters[k].Name == "visitor's card");
        var outcomes = new ClusterRefitter(model, 1).Refit(
            [new(Without(5), model.Parameters, []), new(Without(6), model.Parameters, [])], CancellationToken.None);
        Assert.Equal(FitStatus.NotIdentified, outcomes[0].Status);
        Assert.Equal("not identified", outcomes[0].FailureKind);
        Assert.Equal(place, Assert.Single(outcomes[0].FailedParameters));
        Assert.Equal(FitStatus.Converged, outcomes[1].Status);
    }

    [Fact]
    public void An_alternative_that_is_chosen_no_more_is_found_as_separated()
    {
        var chosers = Enumerable.Range(0, 30).Select(p => Enumerable.Range(p * 8, 8).Any(o => Made.Panel.Chosen[o] == 3)).ToArray();
        Assert.Contains(true, chosers);
        Assert.Contains(false, chosers);
        var outcome = new ClusterRefitter(Model, 1).Refit([Request([.. chosers.Select(c => c ? 0.0 : 1.0)])], CancellationToken.None)[0];
        Assert.Equal(FitStatus.Separated, outcome.Status);
        Assert.Equal("separated", outcome.FailureKind);
        Assert.Contains(2, outcome.FailedParameters);
    }

    [Fact]
    public void Columns_that_become_collinear_without_a_cluster_are_found_as_not_identified()
    {
        // The second card differs from the first for one person alone.
        var first = Fits.Shared(Made, "first card", (o, j) => (o + j) % 3 == 0 ? 1 : 0);
        var second = Fits.Shared(Made, "second card", (o, j) => (o + j) % 3 == 0 ? (o / 8 == 5 ? 2 + (o % 2) : 1) : 0);
        var made = Fits.Add(Fits.Add(Made, first), second);
        var model = Fits.Fit(made, starts: 1);
        Assert.Equal(FitStatus.Converged, model.Status);
        var outcome = new ClusterRefitter(model, 1).Refit([new(Without(5), model.Parameters, [])], CancellationToken.None)[0];
        Assert.Equal(FitStatus.NotIdentified, outcome.Status);
        Assert.Equal(["first card", "second card"], outcome.FailedParameters.Select(k => model.Layout.Parameters[k].Name));
    }

    [Fact]
    public void A_poor_start_still_leads_to_the_maximum()
    {
        var poor = Model.Parameters.Select((p, k) => k < Model.Layout.Coefficients ? -3 * p : 0.02).ToImmutableArray();
        var outcome = new ClusterRefitter(Model, 1).Refit([new(All(1), poor, [])], CancellationToken.None)[0];
        Assert.Equal(FitStatus.Converged, outcome.Status);
        AssertClose(Model.Parameters, outcome.Parameters);
    }

    [Fact]
    public void Wrong_lengths_and_negative_weights_are_refused()
    {
        var refitter = new ClusterRefitter(Model, 1);
        Assert.Throws<ArgumentException>(() => refitter.Refit([new([1.0], Model.Parameters, [])], CancellationToken.None));
        Assert.Throws<ArgumentException>(() => refitter.Refit([new(All(1), [0.0], [])], CancellationToken.None));
        Assert.Throws<ArgumentException>(() => refitter.Refit([new(All(1).SetItem(2, -1), Model.Parameters, [])], CancellationToken.None));
        Assert.Throws<OperationCanceledException>(() => refitter.Refit([new(All(1), Model.Parameters, [])], new CancellationToken(true)));
    }

    private static RefitRequest Request(ImmutableArray<double> weight) => new(weight, Model.Parameters, []);

    private static ImmutableArray<double> All(double weight) => [.. Enumerable.Repeat(weight, 30)];

    private static ImmutableArray<double> Without(int cluster) => All(1).SetItem(cluster, 0);

    private static void AssertClose(ImmutableArray<double> expected, ImmutableArray<double> actual)
    {
        for (var k = 0; k < expected.Length; k++)
            Assert.InRange(Math.Abs(actual[k] - expected[k]), 0, SameMethod * Math.Max(0.1, Math.Abs(expected[k])));
    }
}
