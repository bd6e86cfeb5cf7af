using PanelChoice.Design;
using PanelChoice.Likelihood;
using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Likelihood;

/// <summary>The kernels and forms that every test of the likelihood runs through.</summary>
internal static class Kernels
{
    public static readonly string[] Names = ["scalar", "vector"];

    public static readonly NestedLogitForm[] Forms = [NestedLogitForm.UtilityScaled, NestedLogitForm.Unscaled];

    /// <summary>Kernel x form.</summary>
    public static TheoryData<string, NestedLogitForm> Table
    {
        get
        {
            var table = new TheoryData<string, NestedLogitForm>();
            foreach (var name in Names)
                foreach (var form in Forms) table.Add(name, form);
            return table;
        }
    }

    public static IChoiceLikelihood Create(string kernel, ChoiceDesign design, NestedLogitForm form, int threads = 1) =>
        LikelihoodKernel.Create(design, form, threads, kernel);

    /// <summary>The largest difference, relative to the largest entry of the expected values or 1.</summary>
    public static double Distance(IReadOnlyList<double> expected, IReadOnlyList<double> actual)
    {
        Assert.Equal(expected.Count, actual.Count);
        var scale = Math.Max(1, expected.Select(Math.Abs).DefaultIfEmpty().Max());
        var worst = 0.0;
        for (var i = 0; i < expected.Count; i++)
        {
            var distance = Math.Abs(expected[i] - actual[i]) / scale;
            if (!(distance <= worst)) worst = distance;
        }

        return worst;
    }
}
