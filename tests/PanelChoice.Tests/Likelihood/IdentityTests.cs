using FsCheck;
using FsCheck.Xunit;
using MathNet.Numerics.LinearAlgebra;
using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

/// <summary>What holds for every nested logit, on random trees. Each property is tried on both kernels.</summary>
[Properties(MaxTest = 25, Replay = "20310401,31")]
public class IdentityTests
{
    private const double Identity = 1e-12;

    [Property]
    public void Probabilities_over_all_hypothetical_choices_sum_to_one(DoNotSize<int> seed) => ForEachKernelAndForm((kernel, form) =>
    {
        var made = RandomTreeCase.Make(seed.Item);
        var sum = new double[made.Chosen.Length];
        for (var r = 0; r < made.Names.Length; r++)
        {
            int[] choice = [.. made.Offered.Select(o => OfferedIn(o)[r % OfferedIn(o).Length])];
            var log = Kernels.Create(kernel, (made with { Chosen = choice }).Design(form), form).LogProbabilities(made.Point);
            for (var s = 0; s < sum.Length; s++)
                if (r < OfferedIn(made.Offered[s]).Length) sum[s] += Math.Exp(log[s]);
        }

        Assert.All(sum, p => Assert.InRange(p, 1 - Identity, 1 + Identity));
    });

    [Property]
    public void The_order_of_persons_occasions_and_alternatives_does_not_matter(DoNotSize<int> seed) => ForEachKernelAndForm((kernel, form) =>
    {
        var made = RandomTreeCase.Make(seed.Item, 8, 20);
        int[] persons = [.. Enumerable.Range(0, made.OccasionsOf.Length).OrderBy(p => (p * 5) % 8)];
        int[] alternatives = [.. Enumerable.Range(0, made.Names.Length).Reverse()];
        var other = made.InOrder(persons, reverseOccasions: true).WithAlternatives(alternatives);
        AssertSame(Evaluate(kernel, form, made), Evaluate(kernel, form, other));
    });

    [Property]
    public void A_constant_added_to_every_utility_changes_nothing_in_the_utility_scaled_form(DoNotSize<int> seed) => ForEachKernel(kernel =>
    {
        var made = RandomTreeCase.Make(seed.Item);
        double[][] shift = [.. made.Offered.Select((row, s) => row.Select(_ => 1 + Math.Sin(s)).ToArray())];
        int[] all = [.. Enumerable.Range(0, made.Names.Length)];
        var shifted = made with { Terms = [.. made.Terms, new RandomTerm(all, false, shift)], Coefficients = [.. made.Coefficients, 3.5] };
        var expected = Evaluate(kernel, NestedLogitForm.UtilityScaled, made);
        var found = Evaluate(kernel, NestedLogitForm.UtilityScaled, shifted);
        var place = made.Coefficients.Length;
        Assert.InRange(Math.Abs(found.Gradient[place]), 0, Identity * Math.Max(1, expected.Gradient.Max(Math.Abs)));
        Assert.InRange(Kernels.Distance([expected.Value], [found.Value]), 0, Identity);
        Assert.InRange(Kernels.Distance(expected.Gradient, found.Gradient.RemoveAt(place)), 0, Identity);
    });

    [Property]
    public void The_dissimilarity_of_a_nest_with_one_offered_alternative_has_derivatives_exactly_zero(DoNotSize<int> seed) => ForEachKernel(kernel =>
    {
        var made = RandomTreeCase.Make(seed.Item, isOrdered: true);
        foreach (var nest in made.Nests.Select(n => n.Name))
        {
            var narrow = made.WithOneOfferedUnder(nest);
            var place = narrow.Design(NestedLogitForm.UtilityScaled).Layout.Nests.Single(n => n.Name == nest);
            Assert.Equal(0, place.WideSituations);
            var found = Evaluate(kernel, NestedLogitForm.UtilityScaled, narrow);
            var K = made.Point.Length;
            Assert.Equal(0, found.Gradient[place.Parameter]);
            for (var k = 0; k < K; k++) Assert.Equal(0, found.Hessian[(place.Parameter * K) + k]);
        }
    });

    [Property]
    public void Dissolving_a_nest_whose_dissimilarity_equals_its_parents_changes_nothing_in_the_utility_scaled_form(DoNotSize<int> seed) =>
        ForEachKernel(kernel =>
        {
            var made = RandomTreeCase.Make(seed.Item, isOrdered: true);
            foreach (var nest in made.Nests)
            {
                var parent = made.Nests.SingleOrDefault(n => n.Members.Contains(nest.Name));
                var equal = made with { Dissimilarity = made.Dissimilarity.SetItem(nest.Name, parent is null ? 1 : made.Dissimilarity[parent.Name]) };
                AssertSameForCoefficients(Evaluate(kernel, NestedLogitForm.UtilityScaled, equal), Evaluate(kernel, NestedLogitForm.UtilityScaled, equal.Without(nest.Name)), made);
            }
        });

    [Property]
    public void Dissolving_a_nest_with_dissimilarity_one_changes_nothing_in_the_unscaled_form(DoNotSize<int> seed) => ForEachKernel(kernel =>
    {
        var made = RandomTreeCase.Make(seed.Item, isOrdered: true);
        foreach (var nest in made.Nests)
        {
            var one = made with { Dissimilarity = made.Dissimilarity.SetItem(nest.Name, 1) };
            AssertSameForCoefficients(Evaluate(kernel, NestedLogitForm.Unscaled, one), Evaluate(kernel, NestedLogitForm.Unscaled, one.Without(nest.Name)), made);
        }
    });

    [Property]
    public void All_dissimilarities_one_is_plain_logit(DoNotSize<int> seed) => ForEachKernelAndForm((kernel, form) =>
    {
        var made = RandomTreeCase.Make(seed.Item, isOrdered: true);
        var one = made with { Dissimilarity = made.Dissimilarity.SetItems(made.Nests.Select(n => KeyValuePair.Create(n.Name, 1.0))) };
        var log = Kernels.Create(kernel, one.Design(form), form).LogProbabilities(one.Point);
        for (var s = 0; s < log.Length; s++)
        {
            double Utility(int j) => Enumerable.Range(0, made.Terms.Length)
                .Where(k => made.Terms[k].Enters.Contains(j)).Sum(k => made.Coefficients[k] * made.Terms[k].Value[s][j]);
            var plain = Utility(made.Chosen[s]) - Math.Log(OfferedIn(made.Offered[s]).Sum(j => Math.Exp(Utility(j))));
            Assert.InRange(Math.Abs(log[s] - plain), 0, Identity * Math.Max(1, Math.Abs(plain)));
        }
    });

    [Property]
    public void The_log_likelihood_is_concave_in_the_coefficients_when_dissimilarities_fall_from_one_downwards(DoNotSize<int> seed) =>
        ForEachKernelAndForm((kernel, form) => AssertConcave(kernel, form, RandomTreeCase.Make(seed.Item, isOrdered: true)));

    [Property]
    public void The_log_likelihood_is_concave_in_the_coefficients_for_any_dissimilarities_up_to_one_in_the_unscaled_form(DoNotSize<int> seed) =>
        ForEachKernel(kernel => AssertConcave(kernel, NestedLogitForm.Unscaled, RandomTreeCase.Make(seed.Item, lowest: 0.05, highest: 1)));

    private static void AssertConcave(string kernel, NestedLogitForm form, RandomTreeCase made)
    {
        var found = Evaluate(kernel, form, made);
        var (b, K) = (made.Coefficients.Length, made.Point.Length);
        var block = Matrix<double>.Build.Dense(b, b, (r, c) => found.Hessian[(r * K) + c]);
        var largest = block.Evd(Symmetricity.Symmetric).EigenValues.Max(e => e.Real);
        Assert.InRange(largest, double.NegativeInfinity, Identity * Math.Max(1, block.Enumerate().Max(Math.Abs)));
    }

    private static void AssertSame(LikelihoodEvaluation expected, LikelihoodEvaluation found)
    {
        Assert.InRange(Kernels.Distance([expected.Value], [found.Value]), 0, Identity);
        Assert.InRange(Kernels.Distance(expected.Gradient, found.Gradient), 0, Identity);
        Assert.InRange(Kernels.Distance(expected.Hessian, found.Hessian), 0, 10 * Identity);
    }

    private static void AssertSameForCoefficients(LikelihoodEvaluation expected, LikelihoodEvaluation found, RandomTreeCase made)
    {
        Assert.InRange(Kernels.Distance([expected.Value], [found.Value]), 0, Identity);
        Assert.InRange(Kernels.Distance(expected.Gradient[..made.Coefficients.Length], found.Gradient[..made.Coefficients.Length]), 0, Identity);
    }

    private static LikelihoodEvaluation Evaluate(string kernel, NestedLogitForm form, RandomTreeCase made) =>
        Kernels.Create(kernel, made.Design(form), form).Evaluate(made.Point, [.. made.Weight.Select(w => w + 0.5)], Derivatives.Hessian);

    private static int[] OfferedIn(bool[] offered) => [.. Enumerable.Range(0, offered.Length).Where(j => offered[j])];

    private static void ForEachKernel(Action<string> property)
    {
        foreach (var kernel in Kernels.Names) property(kernel);
    }

    private static void ForEachKernelAndForm(Action<string, NestedLogitForm> property)
    {
        foreach (var kernel in Kernels.Names)
            foreach (var form in Kernels.Forms) property(kernel, form);
    }
}
