using System.Collections.Immutable;
using PanelChoice.Estimation;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

/// <summary>The certificate of a refit is a bound on its true distance from its maximum.</summary>
public class CertificateTests
{
    /// <summary>What rounding leaves open about the distance that is measured.</summary>
    private const double Rounding = 2e-11;

    private static readonly Dictionary<string, Func<Replicates>> Cases = new()
    {
        ["ordinary"] = () => new(Replicates.Panel(1, 100, 20).Design()),
        ["weighted"] = () => new(Replicates.Panel(1, 100, 20).Design() with { PersonWeight = [.. Enumerable.Range(0, 100).Select(p => 40 * Math.Exp(2 * Math.Sin(p)))] }),
        ["few clusters"] = () => new(Replicates.Panel(2, 8, 40).Design()),
        ["few and unequal clusters"] = () => new(Replicates.Panel(3, 12, 20).Design() with { PersonWeight = [.. Enumerable.Range(0, 12).Select(p => p + 0.1)] }),
        ["small dissimilarities"] = () => new(Replicates.Panel(4, 100, 10, 0.15, 0.2).Design()),
        ["strong tastes"] = () => new(Replicates.Panel(5, 40, 10, 0.9, 0.4, tasteSd: 1.5).Design()),
        ["unscaled"] = () => new(Replicates.Panel(6, 100, 20).Design(NestedLogitForm.Unscaled), NestedLogitForm.Unscaled),
        ["a nest in a nest"] = () => new(SyntheticPanel.Make(
            7, 100, 15, 6, [SyntheticPanel.Nest("out", "A", "B", "in"), SyntheticPanel.Nest("in", "C", "D")], [0.8, 0.4], attributes: 4).Design()),
        ["near separation"] = () => new(NearSeparation().Design()),
        ["third derivatives of a part"] = () => new(Replicates.Panel(8, 1500, 4).Design()),
        ["households"] = () => new(Households(Replicates.Panel(9, 120, 10))),
    };

    public static TheoryData<string> Names => [.. Cases.Keys];

    [Theory]
    [MemberData(nameof(Names))]
    public void No_refit_is_farther_from_its_maximum_than_its_certificate_says(string name)
    {
        var replicates = Cases[name]();
        var requests = replicates.Told(replicates.Draws(40).AddRange(replicates.Deletions(Math.Min(15, replicates.Model.Design.Clusters.Length))));
        foreach (var tolerance in new[] { 1e-4, 1e-5, 1e-7 })
        {
            var outcomes = replicates.SideBySide(requests, tolerance);
            var settled = 0;
            for (var r = 0; r < requests.Length; r++)
            {
                if (outcomes[r] is not { } outcome) continue;
                settled++;
                Assert.InRange(outcome.Decrement, 0, tolerance);
                Assert.InRange(replicates.Distance(requests[r], outcome), 0, outcome.Decrement + Rounding);
            }

            Assert.True(settled >= 8, $"{settled} of {requests.Length} settled");
        }
    }

    [Theory]
    [InlineData(false)]
    [InlineData(true)]
    public void Where_the_Hessian_is_the_sample_s_its_distance_from_the_replicate_s_own_is_known_beforehand(bool inHouseholds)
    {
        var made = Replicates.Panel(11, 120, 10);
        var model = new Replicates(inHouseholds ? Households(made) : made.Design() with { PersonWeight = [.. Enumerable.Range(0, 120).Select(p => 1 + (p % 5))] }).Model;
        var (n, K, clusters) = (model.Layout.Free.Length, model.Layout.Count, model.Design.Clusters.Length);
        var expansion = ClusterExpansion.Of(model, model.Likelihood, model.Survey!.Scale, (long)clusters * n, CancellationToken.None)!;
        var requests = new Replicates(model).Draws(60);
        var starts = expansion.At([.. requests.Select(r => r.ClusterWeight)], 1);
        var inverse = PanelChoice.Numerics.ScaledCholesky.Factor([.. model.Hessian.Select(h => -h)], n, out _)!.Inverse();
        var ratios = new List<double>();
        for (var r = 0; r < requests.Length; r++)
        {
            var own = model.Likelihood.Evaluate(model.Parameters.AsSpan(), PreparedRefit.Of(model, requests[r]).PersonWeight, PanelChoice.Likelihood.Derivatives.Hessian).Hessian;
            var share = starts[r].At.Hessian[0] / model.Hessian[0];
            double[] off = [.. own.Select((h, i) => (h - starts[r].At.Hessian[i]) / share)];
            ratios.Add(Math.Sqrt(PanelChoice.Optimisation.SymmetricProduct.SquaredShare(off, inverse, K)) / starts[r].HessianError);
        }

        // It is the root of the mean square over draws, and persons of a household are taken as if all went the same way.
        Assert.InRange(Math.Sqrt(ratios.Average(q => q * q)), 0.4, 1.1);
        Assert.InRange(ratios.Max(), 0, 2);
        var ownHessians = ClusterExpansion.Of(model, model.Likelihood, model.Survey!.Scale, ClusterExpansion.MostEntries, CancellationToken.None)!;
        Assert.Equal(0, ownHessians.At([requests[0].ClusterWeight], 1)[0].HessianError);
    }

    [Fact]
    public void The_certificate_holds_where_one_direction_of_the_sample_s_Hessian_is_wrong()
    {
        // A single nest in the unscaled form: draws differ in what they tell of its dissimilarity far more than in anything else.
        var panel = SyntheticPanel.Make(
            1_000_068, 374, 8, 4, [SyntheticPanel.Nest("one", "B", "C", "D")], [0.4003107664524139], attributes: 1, offeredShare: 0.8423384108138741, tasteSd: 1.2);
        var replicates = new Replicates(panel.Design(NestedLogitForm.Unscaled), NestedLogitForm.Unscaled);
        var requests = replicates.Draws(30, 66).AddRange(replicates.Deletions(5));
        var outcomes = replicates.SideBySide(requests, 1e-5, 374L * replicates.Model.Layout.Free.Length);
        var settled = 0;
        for (var r = 0; r < requests.Length; r++)
        {
            if (outcomes[r] is not { } outcome) continue;
            settled++;
            Assert.InRange(replicates.Distance(requests[r], outcome), 0, outcome.Decrement + Rounding);
        }

        Assert.InRange(settled, 5, requests.Length);
    }

    [Fact]
    public void The_certificate_of_exact_Newton_steps_holds_too()
    {
        foreach (var name in new[] { "ordinary", "weighted", "few clusters", "near separation" })
        {
            var replicates = Cases[name]();
            foreach (var request in replicates.Told(replicates.Draws(15)))
            {
                var outcome = replicates.Exact(request);
                if (outcome.Status != FitStatus.Converged)
                {
                    Assert.True(double.IsNaN(outcome.Decrement));
                    continue;
                }

                Assert.InRange(outcome.Decrement, 0, 1.4e-5);
                Assert.InRange(replicates.Distance(request, outcome), 0, outcome.Decrement + Rounding);
            }
        }
    }

    [Fact]
    public void Weights_in_another_unit_change_neither_the_refit_nor_its_certificate()
    {
        var replicates = Cases["ordinary"]();
        var draw = replicates.Draws(1)[0];
        var small = draw with { ClusterWeight = [.. draw.ClusterWeight.Select(w => w / 1024)] };
        var found = replicates.SideBySide([draw, small], 1e-7);
        Assert.Equal(found[0]!.Parameters.AsEnumerable(), found[1]!.Parameters);
        // In units of clones a weight of 2 counts as two; as sampling weights their mean is scaled to 1. The first is the stricter.
        Assert.InRange(found[0]!.Decrement / found[1]!.Decrement, 1, 1.5);
    }

    [Fact]
    public void Where_the_way_is_too_short_to_test_the_Hessian_its_error_is_not_taken_for_nothing()
    {
        var exact = Cases["ordinary"]().Model;
        // A start three billionths of a standard error off, and a Hessian that is too large by a third: the sample itself is the replicate.
        var k = 0;
        var near = exact.Parameters.SetItem(k, exact.Parameters[k] + (3e-9 / Math.Sqrt(-exact.Hessian[0])));
        var replicates = new Replicates(exact with { Parameters = near, Hessian = [.. exact.Hessian.Select(h => 4 * h / 3)] });
        var clusters = exact.Design.Clusters.Length;
        var request = new RefitRequest([.. Enumerable.Repeat(1.0, clusters)], near, []);
        var outcome = Assert.Single(replicates.SideBySide([request], 1e-5, clusters * (long)exact.Layout.Free.Length));
        Assert.NotNull(outcome);
        var distance = replicates.Distance(request, outcome);
        Assert.True(distance > 5 * Rounding, $"the distance {distance} tests nothing");
        Assert.InRange(distance, 0, outcome.Decrement);
    }

    /// <summary>A column that nearly every choice goes along.</summary>
    private static SyntheticPanel NearSeparation()
    {
        var made = Replicates.Panel(10, 60, 20);
        var chosen = made.Panel.Chosen;
        return Fits.Add(made, Fits.Shared(made, "signpost", (o, j) => o % 3 == 0 && (chosen[o] == j) == (o % 57 != 0) ? 1 : 0));
    }

    private static PanelChoice.Design.ChoiceDesign Households(SyntheticPanel made)
    {
        var design = made.Design();
        ImmutableArray<int> household = [.. Enumerable.Range(0, design.Persons).Select(p => p * 7 % 40)];
        return design with { ClusterBy = "household", ClusterOf = household, Clusters = [.. Enumerable.Range(0, 40).Select(h => $"h{h}")] };
    }
}
