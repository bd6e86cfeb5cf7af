using System.Globalization;
using Xunit;

namespace PanelChoice.Tests.Reference;

/// <summary>Compares figures with expected ones and tells all that disagree at once.</summary>
internal sealed class Agreement(double relative)
{
    /// <summary>The same sum in another order.</summary>
    public const double SameSum = 1e-12;

    /// <summary>A log-likelihood: half a unit of the 11th significant digit, whatever the first one is.</summary>
    public const double LogLikelihood = 5e-12;

    /// <summary>A coefficient: the same method in another program.</summary>
    public const double Coefficient = 1e-8;

    /// <summary>A standard error or covariance: another program.</summary>
    public const double OtherProgram = 1e-6;

    private readonly List<string> wrong = [];

    /// <summary>How many figures were compared.</summary>
    public int Compared { get; private set; }

    public void Compare(string what, double expected, double actual)
    {
        Compared++;
        // Written so that NaN disagrees with everything.
        if (!(Math.Abs(actual - expected) <= relative * Math.Abs(expected)))
            wrong.Add(string.Create(
                CultureInfo.InvariantCulture, $"{what}: expected {expected:R}, got {actual:R}, relative {Math.Abs((actual - expected) / expected):0.0e0}"));
    }

    public void AssertAll(int least)
    {
        Assert.True(wrong.Count == 0, $"{wrong.Count} of {Compared} figures disagree\n{string.Join("\n", wrong)}");
        Assert.True(Compared >= least, $"only {Compared} figures were compared");
    }
}
