using PanelChoice.Estimation;
using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

/// <summary>Two small panels, found by a search over seeds, whose likelihood has two interior maxima.</summary>
public class SeveralMaximaTests
{
    [Theory]
    [InlineData(1600, -46.867817, -47.426816)]
    [InlineData(4420, -45.327025, -45.685256)]
    public void The_search_from_plain_logit_alone_ends_in_the_lower_maximum_and_many_starts_find_both(int seed, double better, double worse)
    {
        var made = SyntheticPanel.Make(seed, 10, 4, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.3], attributes: 1);
        var alone = Fits.Fit(made, starts: 1);
        Assert.Equal(FitStatus.Converged, alone.Status);
        Assert.Equal(worse, alone.LogLikelihood, 6);

        var many = Fits.Fit(made, starts: 8);
        Assert.Equal(FitStatus.Converged, many.Status);
        Assert.Equal(better, many.LogLikelihood, 6);
        Assert.Equal(2, many.Optima.Length);
        Assert.Equal(better, many.Optima[0].LogLikelihood, 6);
        Assert.Equal(worse, many.Optima[1].LogLikelihood, 6);
        Assert.Equal(8, many.StartsConverged);
        Assert.Equal(8, many.Optima.Sum(o => o.Starts));
        Assert.Contains(many.Findings, f => f.Id == "fit.several_maxima");
        foreach (var optimum in many.Optima)
        {
            var gradient = many.Likelihood.Evaluate(optimum.Parameters.AsSpan(), many.Design.PersonWeight.AsSpan(), Derivatives.Gradient).Gradient;
            Assert.All(gradient, g => Assert.InRange(Math.Abs(g), 0, 1e-8));
        }
    }

    [Theory]
    [InlineData(1600, -46.867817, -47.426816)]
    [InlineData(4420, -45.327025, -45.685256)]
    public void Searching_on_a_part_of_a_large_sample_first_loses_no_maximum(int seed, double better, double worse)
    {
        const int Copies = 400;
        var made = SyntheticPanel.Make(seed, 10, 4, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.3], attributes: 1);
        for (var order = 0; order < 4; order++)
        {
            int[] persons = [.. Enumerable.Range(0, 10 * Copies).Select(i => i % 10)];
            Shuffle(persons, order);
            var design = Fits.Persons(made, persons);
            Assert.NotNull(ThinnedSample.Weights(design));
            var many = Fits.Fit(design, NestedLogitForm.UtilityScaled, 8);
            Assert.Equal(2, many.Optima.Length);
            Assert.Equal(8, many.Optima.Sum(o => o.Starts));
            Assert.Equal(better, many.Optima[0].LogLikelihood / Copies, 6);
            Assert.Equal(worse, many.Optima[1].LogLikelihood / Copies, 6);
        }
    }

    [Fact]
    public void The_same_seed_gives_the_same_starts_and_another_seed_the_same_best()
    {
        var made = SyntheticPanel.Make(1600, 10, 4, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.3], attributes: 1);
        FittedModel With(long seed) => MaximumLikelihood.Fit(
            LikelihoodKernel.Create(made.Design(), NestedLogitForm.UtilityScaled, 1), NestedLogitForm.UtilityScaled,
            new EstimateSettings(NestedLogitForm.UtilityScaled, 12, seed), PanelChoice.Numerics.WorkContext.Quiet);
        var (first, again, other) = (With(7), With(7), With(8));
        Assert.Equal(first.Parameters.ToArray(), again.Parameters.ToArray());
        Assert.Equal(first.Optima.Select(o => o.Starts), again.Optima.Select(o => o.Starts));
        Assert.Equal(first.LogLikelihood, other.LogLikelihood, 10);
    }

    private static void Shuffle(int[] persons, int order)
    {
        var random = new PanelChoice.Numerics.CounterRandom(20310403, "order of persons", order);
        for (var i = persons.Length - 1; i > 0; i--)
        {
            var j = random.Next(i + 1);
            (persons[i], persons[j]) = (persons[j], persons[i]);
        }
    }
}
