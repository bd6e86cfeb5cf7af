using PanelChoice.Estimation;
using PanelChoice.Inference;
using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Inference;

public class NullValueTests
{
    private static readonly NestSpecification Inner = SyntheticPanel.Nest("inner", "A", "B");
    private static readonly NestSpecification Outer = SyntheticPanel.Nest("outer", "inner", "C");

    [Fact]
    public void Under_the_root_a_dissimilarity_is_tested_against_one_and_a_coefficient_against_zero()
    {
        Assert.Equal(new NullValue(1, null, null), Null("inner", [0.6], Inner));
        Assert.Equal(new NullValue(0, null, null), Null("constant", [0.6], Inner));
    }

    [Fact]
    public void Under_a_nest_it_is_tested_against_that_nests_value_estimated_or_fixed()
    {
        var (free, layout) = NullAndPlace("inner", "outer", [0.5, 0.8], NestedLogitForm.UtilityScaled, Inner, Outer);
        Assert.Equal(new NullValue(0.8, layout, null), free);
        Assert.Equal(new NullValue(0.7, null, null), Null("inner", [0.5], Inner, Outer with { Dissimilarity = 0.7 }));
    }

    [Fact]
    public void A_parent_that_shares_the_parameter_sets_no_bound_of_its_own()
    {
        Assert.Equal(new NullValue(1, null, null), Null("inner", [0.6], Inner, Outer with { SameAs = "inner" }));
    }

    [Fact]
    public void Nests_that_share_it_under_different_parents_leave_no_single_value_to_test_against()
    {
        var other = SyntheticPanel.Nest("other", "D", "E") with { SameAs = "inner" };
        Assert.NotNull(Null("inner", [0.5, 0.8], Inner, Outer, other).Withheld);
    }

    [Fact]
    public void In_the_unscaled_form_it_is_relative_already_and_tested_against_one()
    {
        var (unscaled, _) = NullAndPlace("inner", "outer", [0.5, 0.8], NestedLogitForm.Unscaled, Inner, Outer);
        Assert.Equal(new NullValue(1, null, null), unscaled);
    }

    private static NullValue Null(string name, double[] dissimilarities, params NestSpecification[] nests) =>
        NullAndPlace(name, name, dissimilarities, NestedLogitForm.UtilityScaled, nests).Null;

    private static (NullValue Null, int Other) NullAndPlace(
        string name, string other, double[] dissimilarities, NestedLogitForm form, params NestSpecification[] nests)
    {
        var made = SyntheticPanel.Make(71, 6, 3, 5, [.. nests], dissimilarities);
        var design = made.Design(form);
        var likelihood = new ScalarNestedLogit(design, form, 1);
        var parameters = design.Layout.Parameters.Select((p, k) => p.Fixed ?? 0).ToArray();
        var next = 0;
        for (var k = design.Layout.Coefficients; k < design.Layout.Count; k++)
            if (design.Layout.Parameters[k].IsFree) parameters[k] = dissimilarities[next++];
        var hessian = likelihood.Evaluate(parameters, design.PersonWeight.AsSpan(), Derivatives.Hessian).Hessian;
        var model = new FittedModel(likelihood, form, FitStatus.Converged, [.. parameters], 0, 0, null, hessian, 0, 0, 1, 1, [], []);
        var input = InferenceInput.From(model, new ScriptedRefitter(_ => throw new InvalidOperationException()));
        int Place(string label) => Enumerable.Range(0, design.Layout.Count).First(k => design.Layout.Parameters[k].Name == label);
        return (input.Nulls[input.Free.IndexOf(Place(name))], Place(other));
    }
}
