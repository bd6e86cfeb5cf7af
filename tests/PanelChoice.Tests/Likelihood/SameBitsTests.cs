using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

public class SameBitsTests
{
    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Figures_are_the_same_bits_for_any_number_of_threads_and_on_a_second_call(string kernel, NestedLogitForm form)
    {
        // Long enough for the vector kernel to use threads at all.
        var made = RandomTreeCase.Make(11, 1_000, 100);
        var design = made.Design(form);
        Assert.True(design.Situations >= VectorNestedLogit.SituationsForThreads);
        var one = Figures(Kernels.Create(kernel, design, form, 1), made);
        foreach (var threads in (int[])[2, 5])
        {
            var likelihood = Kernels.Create(kernel, design, form, threads);
            Assert.Equal(one, Figures(likelihood, made));
            Assert.Equal(one, Figures(likelihood, made));
        }
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Several_threads_may_call_one_likelihood_at_once(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(12, 30, 20);
        var likelihood = Kernels.Create(kernel, made.Design(form), form);
        double[][] points = [.. Enumerable.Range(0, 16).Select(i => made.Point.Select(x => x * (1 + (0.01 * i))).ToArray())];
        double[][] alone = [.. points.Select(p => Figures(likelihood, made with { Coefficients = p[..made.Coefficients.Length] }))];
        var together = new double[points.Length][];
        Parallel.For(0, points.Length, new ParallelOptions { MaxDegreeOfParallelism = 8 }, i =>
            together[i] = Figures(likelihood, made with { Coefficients = points[i][..made.Coefficients.Length] }));
        Assert.Equal(alone, together);
    }

    private static double[] Figures(IChoiceLikelihood likelihood, RandomTreeCase made)
    {
        var all = likelihood.Evaluate(made.Point, made.Weight, Derivatives.Hessian);
        var sums = likelihood.SumScores(made.Point, made.Weight);
        return
        [
            all.Value, .. all.Gradient, .. all.Hessian, .. likelihood.Scores(made.Point), .. likelihood.LogProbabilities(made.Point),
            .. likelihood.PersonInformation(made.Point), .. sums.ByPerson, .. sums.Products,
        ];
    }
}
