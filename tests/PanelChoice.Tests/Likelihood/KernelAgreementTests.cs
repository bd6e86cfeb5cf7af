using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

public class KernelAgreementTests
{
    private const int Cases = 12;

    public static TheoryData<NestedLogitForm> Forms => [.. Kernels.Forms];

    [Theory]
    [MemberData(nameof(Forms))]
    public void Both_kernels_give_the_same_figures(NestedLogitForm form)
    {
        foreach (var made in LargerCases())
        {
            var (scalar, vector) = (Kernels.Create("scalar", made.Design(form), form), Kernels.Create("vector", made.Design(form), form));
            var expected = scalar.Evaluate(made.Point, made.Weight, Derivatives.Hessian);
            var found = vector.Evaluate(made.Point, made.Weight, Derivatives.Hessian);
            Assert.InRange(Kernels.Distance([expected.Value], [found.Value]), 0, 1e-13);
            Assert.InRange(Kernels.Distance(expected.Gradient, found.Gradient), 0, 1e-12);
            Assert.InRange(Kernels.Distance(expected.Hessian, found.Hessian), 0, 1e-11);
            Assert.InRange(Kernels.Distance(scalar.Scores(made.Point), vector.Scores(made.Point)), 0, 1e-12);
            Assert.InRange(Kernels.Distance(scalar.LogProbabilities(made.Point), vector.LogProbabilities(made.Point)), 0, 1e-13);
            Assert.InRange(Kernels.Distance(scalar.PersonInformation(made.Point), vector.PersonInformation(made.Point)), 0, 1e-11);
        }
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Scores_sum_to_the_gradient_and_information_of_persons_to_minus_the_Hessian(string kernel, NestedLogitForm form)
    {
        foreach (var made in LargerCases())
        {
            var likelihood = Kernels.Create(kernel, made.Design(form), form);
            var (point, K) = (made.Point, made.Point.Length);
            var whole = likelihood.Evaluate(point, made.Weight, Derivatives.Hessian);
            var scores = likelihood.Scores(point);
            var log = likelihood.LogProbabilities(point);
            var information = likelihood.PersonInformation(point);
            var value = 0.0;
            var gradient = new double[K];
            var hessian = new double[K * K];
            for (var s = 0; s < log.Length; s++)
            {
                var weight = made.Weight[likelihood.Design.PersonOf[s]];
                value += weight * log[s];
                for (var k = 0; k < K; k++) gradient[k] += weight * scores[(s * K) + k];
            }

            for (var p = 0; p < made.Weight.Length; p++)
                for (var i = 0; i < K * K; i++) hessian[i] -= made.Weight[p] * information[(p * K * K) + i];
            Assert.InRange(Kernels.Distance([whole.Value], [value]), 0, 1e-12);
            Assert.InRange(Kernels.Distance(whole.Gradient, gradient), 0, 1e-12);
            Assert.InRange(Kernels.Distance(whole.Hessian, hessian), 0, 1e-11);
        }
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Sums_of_scores_are_those_of_the_scores_one_by_one(string kernel, NestedLogitForm form)
    {
        foreach (var made in LargerCases())
        {
            var likelihood = Kernels.Create(kernel, made.Design(form), form);
            var (point, K) = (made.Point, made.Point.Length);
            double[] weight = [.. made.Weight.Select((w, p) => p % 3 == 1 ? 0 : w + (0.5 * p))];
            var scores = likelihood.Scores(point);
            var byPerson = new double[weight.Length * K];
            var products = new double[K * K];
            for (var s = 0; s < likelihood.Design.Situations; s++)
            {
                var person = likelihood.Design.PersonOf[s];
                for (var k = 0; k < K; k++)
                {
                    byPerson[(person * K) + k] += weight[person] * scores[(s * K) + k];
                    for (var q = 0; q < K; q++) products[(k * K) + q] += weight[person] * scores[(s * K) + k] * weight[person] * scores[(s * K) + q];
                }
            }

            var found = likelihood.SumScores(point, weight);
            Assert.InRange(Kernels.Distance(byPerson, found.ByPerson), 0, 1e-12);
            Assert.InRange(Kernels.Distance(products, found.Products), 0, 1e-12);
        }
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Less_asked_for_gives_the_same_bits(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(3, 30, 20);
        var likelihood = Kernels.Create(kernel, made.Design(form), form);
        var all = likelihood.Evaluate(made.Point, made.Weight, Derivatives.Hessian);
        var first = likelihood.Evaluate(made.Point, made.Weight, Derivatives.Gradient);
        var value = likelihood.Evaluate(made.Point, made.Weight, Derivatives.None);
        Assert.Equal(all.Value, first.Value);
        Assert.Equal(all.Value, value.Value);
        Assert.Equal(all.Gradient.ToArray(), first.Gradient.ToArray());
        Assert.Empty(first.Hessian);
        Assert.Empty(value.Gradient);
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Persons_with_weight_zero_contribute_nothing(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(5, 40, 20);
        var likelihood = Kernels.Create(kernel, made.Design(form), form);
        var none = likelihood.Evaluate(made.Point, new double[40], Derivatives.Hessian);
        Assert.Equal(0, none.Value);
        Assert.All(none.Gradient, g => Assert.Equal(0, g));
        Assert.All(none.Hessian, h => Assert.Equal(0, h));

        double[] half = [.. made.Weight.Select((_, p) => p % 2 == 0 ? 1.0 : 0)];
        int[] kept = [.. Enumerable.Range(0, 20).Select(i => 2 * i)];
        var without = made.InOrder(kept, reverseOccasions: false);
        var expected = Kernels.Create(kernel, without.Design(form), form).Evaluate(made.Point, [.. kept.Select(_ => 1.0)], Derivatives.Hessian);
        var found = likelihood.Evaluate(made.Point, half, Derivatives.Hessian);
        Assert.InRange(Kernels.Distance([expected.Value], [found.Value]), 0, 1e-13);
        Assert.InRange(Kernels.Distance(expected.Gradient, found.Gradient), 0, 1e-12);
        Assert.InRange(Kernels.Distance(expected.Hessian, found.Hessian), 0, 1e-11);
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void A_person_with_weight_zero_does_no_harm_even_where_its_utilities_overflow(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(6, 8, 6);
        var first = made.OccasionsOf[0];
        int[] everything = [.. Enumerable.Range(0, made.Names.Length)];
        double[][] huge = [.. made.Chosen.Select((_, s) => everything.Select(j => s < first ? (j + 1) * 1e200 : 0).ToArray())];
        var overflowing = made with { Terms = [.. made.Terms, new RandomTerm(everything, false, huge)], Coefficients = [.. made.Coefficients, 1e200] };
        double[] weight = [.. made.Weight.Select((w, p) => p == 0 ? 0 : w + 1)];
        var expected = Kernels.Create(kernel, made.Design(form), form).Evaluate(made.Point, weight, Derivatives.Hessian);
        var found = Kernels.Create(kernel, overflowing.Design(form), form).Evaluate(overflowing.Point, weight, Derivatives.Hessian);
        Assert.InRange(Kernels.Distance([expected.Value], [found.Value]), 0, 1e-13);
        Assert.InRange(Kernels.Distance(expected.Gradient, found.Gradient.RemoveAt(made.Coefficients.Length)), 0, 1e-12);
        Assert.All(found.Hessian, h => Assert.True(double.IsFinite(h)));
    }

    /// <summary>Several blocks, and a last person longer than a block, so that blocks are cut into strips.</summary>
    private static IEnumerable<RandomTreeCase> LargerCases()
    {
        for (var seed = 101; seed < 101 + Cases; seed++)
        {
            var made = RandomTreeCase.Make(seed, 20, 80);
            var blocks = made.Design(NestedLogitForm.Unscaled).Blocks;
            Assert.True(blocks.Length > 2 && blocks[^1].Lanes > 256 && blocks.Any(b => b.Lanes != b.Situations));
            yield return made;
        }
    }
}
