using System.Numerics;
using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

public class DerivativeTests
{
    private const int Points = 20;
    private const double SameMethod = 1e-8;

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Value_gradient_and_Hessian_equal_those_of_complex_arithmetic_on_random_trees(string kernel, NestedLogitForm form)
    {
        for (var seed = 1; seed <= Points; seed++)
        {
            var made = RandomTreeCase.Make(seed);
            var point = made.Point;
            var reference = new ComplexNestedLogit(made, form);
            var found = Kernels.Create(kernel, made.Design(form), form).Evaluate(point, made.Weight, Derivatives.Hessian);
            Assert.InRange(Kernels.Distance([reference.LogLikelihood([.. point.Select(x => new Complex(x, 0))]).Real], [found.Value]), 0, 1e-13);
            Assert.InRange(Kernels.Distance(reference.Gradient(point), found.Gradient), 0, 1e-12);
            Assert.InRange(Kernels.Distance(reference.Hessian(point), found.Hessian), 0, SameMethod);
        }
    }

    [Fact]
    public void Random_trees_reach_four_nodes_and_have_shared_fixed_and_one_alternative_nests()
    {
        var cases = Enumerable.Range(1, Points).Select(seed => RandomTreeCase.Make(seed)).ToList();
        Assert.Equal(4, cases.Max(c => Depth(c.Tree, c.Tree.Root)));
        Assert.Contains(cases, c => c.Nests.Any(n => n.SameAs is not null));
        Assert.Contains(cases, c => c.Nests.Any(n => n.Dissimilarity is not null));
        Assert.Contains(cases, c => c.Nests.Any(n => n.Members.Length == 1));
        Assert.Contains(cases, c => c.Weight.Contains(0));
    }

    private static int Depth(NestTree tree, int node) =>
        1 + tree.Nodes[node].Children.Where(c => !tree.IsAlternative(c)).Select(c => Depth(tree, c - tree.Alternatives.Length)).DefaultIfEmpty().Max();
}
