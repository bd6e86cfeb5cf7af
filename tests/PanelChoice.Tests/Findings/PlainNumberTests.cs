using System.Globalization;
using PanelChoice.Findings;
using Xunit;

namespace PanelChoice.Tests.Findings;

/// <summary>Numbers as people read them.</summary>
public class PlainNumberTests
{
    [Theory]
    [InlineData(-1.234567, 0.0432, "-1.2346")]
    [InlineData(1.234567, 0.432, "1.235")]
    [InlineData(12345.678, 432.0, "12346")]
    [InlineData(0.00012345, 0.00000456, "1.23e-4")]
    [InlineData(1.5, null, "1.500")]
    [InlineData(0, null, "0.000")]
    [InlineData(-0.00001, 0.5, "0.000")]
    [InlineData(double.NaN, 0.1, "none")]
    [InlineData(double.PositiveInfinity, 0.1, "none")]
    [InlineData(1, double.NaN, "1.000")]
    [InlineData(1, 0.0, "1.000")]
    [InlineData(3e12, 1e10, "3.00e+12")]
    public void A_value_is_rounded_to_three_digits_of_its_standard_error(double value, double? se, string text) =>
        Assert.Equal(text, PlainNumber.Rounded(value, se));

    [Theory]
    [InlineData(0.5, "0.500")]
    [InlineData(0.00049, "0.0005")]
    [InlineData(0.0001, "0.0001")]
    [InlineData(0.00009, "below 0.0001")]
    [InlineData(0, "below 0.0001")]
    [InlineData(1, "1.000")]
    public void A_p_value_has_three_digits_or_is_below_a_bound(double p, string text) => Assert.Equal(text, PlainNumber.PValue(p));

    [Fact]
    public void Numbers_are_the_same_under_any_culture()
    {
        var before = CultureInfo.CurrentCulture;
        try
        {
            CultureInfo.CurrentCulture = EndToEnd.Cultures.Apostrophe;
            Assert.Equal("-1.2346", PlainNumber.Rounded(-1.234567, 0.0432));
            Assert.Equal("1,234,567", PlainNumber.Count(1234567));
            Assert.Equal("12.3%", PlainNumber.Percent(0.1234));
            Assert.Equal("99.5 percent", PlainNumber.PercentInWords(0.995));
            Assert.Equal("1 person", PlainNumber.Counted(1, "person"));
        }
        finally
        {
            CultureInfo.CurrentCulture = before;
        }
    }
}
