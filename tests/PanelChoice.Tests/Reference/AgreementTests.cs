using Xunit;
using Xunit.Sdk;

namespace PanelChoice.Tests.Reference;

/// <summary>A comparison that cannot fail would prove nothing.</summary>
public class AgreementTests
{
    [Theory]
    [InlineData(1.0, 1.0000009, true)]
    [InlineData(1.0, 1.0000011, false)]
    [InlineData(-1e-9, -1.0000011e-9, false)]
    [InlineData(0.0, 0.0, true)]
    [InlineData(0.0, 1e-300, false)]
    [InlineData(1.0, double.NaN, false)]
    [InlineData(double.NaN, double.NaN, false)]
    public void Figures_agree_up_to_their_relative_difference(double expected, double actual, bool agree)
    {
        var agreement = new Agreement(Agreement.OtherProgram);
        agreement.Compare("figure", expected, actual);
        if (agree) agreement.AssertAll(1);
        else Assert.ThrowsAny<XunitException>(() => agreement.AssertAll(1));
    }

    [Fact]
    public void Too_few_figures_are_no_agreement() => Assert.ThrowsAny<XunitException>(() => new Agreement(1).AssertAll(1));
}
