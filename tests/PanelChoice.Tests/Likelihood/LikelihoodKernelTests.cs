using PanelChoice.Likelihood;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

public class LikelihoodKernelTests
{
    [Theory]
    [InlineData(null, "vector")]
    [InlineData("", "vector")]
    [InlineData("vector", "vector")]
    [InlineData("scalar", "scalar")]
    public void The_vector_kernel_runs_unless_the_scalar_one_is_asked_for(string? asked, string name)
    {
        var design = RandomTreeCase.Make(1).Design(NestedLogitForm.UtilityScaled);
        Assert.StartsWith(name, LikelihoodKernel.Create(design, NestedLogitForm.UtilityScaled, 1, asked).Kernel, StringComparison.Ordinal);
    }

    [Fact]
    public void Another_name_is_refused_with_the_names_that_exist()
    {
        var design = RandomTreeCase.Make(1).Design(NestedLogitForm.UtilityScaled);
        var refusal = Assert.Throws<ArgumentException>(() => LikelihoodKernel.Create(design, NestedLogitForm.UtilityScaled, 1, "quick"));
        Assert.Contains("PANELCHOICE_KERNEL", refusal.Message, StringComparison.Ordinal);
        Assert.Contains("'quick'", refusal.Message, StringComparison.Ordinal);
        Assert.Contains("scalar, vector, vector512 or vector256", refusal.Message, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("vector256", "vector512", "DOTNET_EnableAVX512=0")]
    [InlineData("vector512", "vector256", "this process has vector256")]
    [InlineData("vector512", "vector512", null)]
    [InlineData("vector256", "vector256", null)]
    [InlineData("vector", "vector256", null)]
    [InlineData("scalar", "vector512", null)]
    [InlineData("vector256", "vector128", "this process has vector128")]
    public void A_width_is_given_where_the_process_has_it_and_otherwise_refused_with_the_remedy(string asked, string here, string? says)
    {
        var refusal = LikelihoodKernel.Refusal(asked, here);
        if (says is null) Assert.Null(refusal);
        else Assert.Contains(says, refusal, StringComparison.Ordinal);
    }

    [Theory]
    [MemberData(nameof(Kernels.Table), MemberType = typeof(Kernels))]
    public void A_wrong_number_of_parameters_is_refused(string kernel, NestedLogitForm form)
    {
        var made = RandomTreeCase.Make(1);
        var likelihood = Kernels.Create(kernel, made.Design(form), form);
        Assert.Throws<ArgumentException>(() => likelihood.Evaluate(made.Point.AsSpan(1), made.Weight, Derivatives.None));
        Assert.Throws<ArgumentException>(() => likelihood.Scores([.. made.Point, 1]));
    }
}
