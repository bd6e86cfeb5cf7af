using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

/// <summary>One read of the data for many replicates gives each what a pass of its own gives.</summary>
public class ReplicateLikelihoodTests
{
    private const double Identity = 1e-12;

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Each_point_has_the_value_and_gradient_of_a_pass_of_its_own(string kernel, NestedLogitForm form)
    {
        foreach (var seed in new[] { 31, 32, 33 })
        {
            var made = RandomTreeCase.Make(seed, 60, 9);
            var likelihood = Kernels.Create(kernel, made.Design(form), form);
            var points = Points(made, 7);
            var together = SeparatePasses.Of(likelihood).Gradients(points, CancellationToken.None);
            for (var i = 0; i < points.Length; i++)
            {
                var alone = likelihood.Evaluate(points[i].Parameters, points[i].PersonWeight, Derivatives.Gradient);
                Assert.Equal(alone.Value, together[i].Value, Identity * (1 + Math.Abs(alone.Value)));
                Assert.InRange(Kernels.Distance(alone.Gradient, together[i].Gradient), 0, Identity);
                Assert.Empty(together[i].Hessian);
            }
        }
    }

    [Fact]
    public void The_bits_of_a_point_depend_on_nothing_beside_it()
    {
        // Long enough for the vector kernel to use threads at all.
        const NestedLogitForm Form = NestedLogitForm.UtilityScaled;
        const string Kernel = "vector";
        var made = RandomTreeCase.Make(11, 1_000, 100);
        var design = made.Design(Form);
        Assert.True(design.Situations >= VectorNestedLogit.SituationsForThreads);
        var points = Points(made, 3);
        var one = SeparatePasses.Of(Kernels.Create(Kernel, design, Form, 1)).Gradients(points, CancellationToken.None);
        var two = SeparatePasses.Of(Kernels.Create(Kernel, design, Form, 2)).Gradients([points[2], points[0], points[1]], CancellationToken.None);
        var alone = SeparatePasses.Of(Kernels.Create(Kernel, design, Form, 2)).Gradients([points[1]], CancellationToken.None)[0];
        for (var i = 0; i < 3; i++) AssertSame(one[i], two[(i + 1) % 3]);
        AssertSame(one[1], alone);
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Persons_add_up_to_the_sample(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(35, 3_000, 3);
        var likelihood = Kernels.Create(kernel, made.Design(form), form);
        var K = made.Point.Length;
        var gradient = new double[K];
        var hessian = new double[K * K];
        var next = 0;
        SeparatePasses.Of(likelihood).ForEachPerson(made.Point, (person, score, second) =>
        {
            Assert.Equal(next++, person);
            for (var k = 0; k < K; k++) gradient[k] += made.Weight[person] * score[k];
            for (var k = 0; k < K * K; k++) hessian[k] += made.Weight[person] * second[k];
        }, CancellationToken.None);
        Assert.Equal(3_000, next);
        var whole = likelihood.Evaluate(made.Point, made.Weight, Derivatives.Hessian);
        Assert.InRange(Kernels.Distance(whole.Gradient, gradient), 0, Identity);
        Assert.InRange(Kernels.Distance(whole.Hessian, hessian), 0, Identity);
    }

    [Theory]
    [InlineData("scalar")]
    [InlineData("vector")]
    public void A_person_whose_derivatives_overflow_leaves_the_others_alone(string kernel)
    {
        const NestedLogitForm Form = NestedLogitForm.UtilityScaled;
        // More persons than are held at a time; the utilities of the first are beyond the range of numbers.
        var plain = SyntheticPanel.Make(41, 2_200, 2, 3, [], [], attributes: 1, offeredShare: 1);
        var made = Estimation.Fits.Add(plain, Estimation.Fits.Shared(plain, "height", (o, j) => o < 2 ? 1e300 * (j - 1) : 0.1 * ((o + j) % 3)));
        var likelihood = Kernels.Create(kernel, made.Design(Form), Form);
        double[] point = [0.1, -0.2, -0.5, 1e10];
        var scores = likelihood.Scores(point);
        SeparatePasses.Of(likelihood).ForEachPerson(point, (person, score, second) =>
        {
            if (person == 0) return;
            Assert.Equal(scores[person * 8] + scores[(person * 8) + 4], score[0], Identity);
            Assert.True(double.IsFinite(second[0]), $"person {person}");
        }, CancellationToken.None);
        var first = double.NaN;
        SeparatePasses.Of(likelihood).ForEachPerson(point, (person, score, _) => first = person == 0 ? score[0] : first, CancellationToken.None);
        Assert.True(double.IsNaN(first), "nothing overflows here");
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Outside_the_domain_a_point_is_not_a_number_and_leaves_the_others_alone(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(36, 20, 5);
        var passes = SeparatePasses.Of(Kernels.Create(kernel, made.Design(form), form));
        var points = Points(made, 2);
        var outside = points[0] with { Parameters = [.. points[0].Parameters.Select((p, k) => k == 0 ? double.NaN : p)] };
        var together = passes.Gradients([outside, points[1]], CancellationToken.None);
        Assert.True(double.IsNaN(together[0].Value));
        Assert.All(together[0].Gradient, g => Assert.True(double.IsNaN(g)));
        AssertSame(passes.Gradients([points[1]], CancellationToken.None)[0], together[1]);
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void Cancelling_stops(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(37, 10, 5);
        var passes = SeparatePasses.Of(Kernels.Create(kernel, made.Design(form), form));
        var cancelled = new CancellationToken(true);
        Assert.Throws<OperationCanceledException>(() => passes.Gradients(Points(made, 1), cancelled));
        Assert.Throws<OperationCanceledException>(() => passes.ForEachPerson(made.Point, (_, _, _) => { }, cancelled));
    }

    /// <summary>Points beside each other, each with runs of persons whose weight is 0: none, some, most.</summary>
    private static WeightedPoint[] Points(RandomTreeCase made, int count) =>
    [
        .. Enumerable.Range(0, count).Select(i => new WeightedPoint(
            [.. made.Point.Select(x => x * (1 + (0.01 * i)))], [.. made.Weight.Select((w, p) => ((p / 2) + i) % (i + 1) == 0 || i == 0 ? w : 0)])),
    ];

    private static void AssertSame(LikelihoodEvaluation a, LikelihoodEvaluation b)
    {
        Assert.Equal(a.Value, b.Value);
        Assert.Equal(a.Gradient.AsEnumerable(), b.Gradient);
    }
}
