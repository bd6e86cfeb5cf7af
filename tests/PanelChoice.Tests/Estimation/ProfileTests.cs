using PanelChoice.Estimation;
using PanelChoice.Optimisation;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Estimation;

public class ProfileTests
{
    [Theory]
    [InlineData(NestedLogitForm.UtilityScaled)]
    [InlineData(NestedLogitForm.Unscaled)]
    public void No_point_of_a_fine_profile_lies_above_the_estimate(NestedLogitForm form)
    {
        // Small panels, in which second maxima and edges are common; the profile is taken over l from 0.001 to 20, far finer than any start.
        var ended = new HashSet<FitStatus>();
        for (var seed = 1; seed <= 24; seed++)
        {
            var made = SyntheticPanel.Make(
                7000 + seed, 8 + (seed % 5 * 4), 4, 4, [SyntheticPanel.Nest("pair", "A", "B")], [0.2 + (0.3 * (seed % 5))], attributes: 1 + (seed % 2));
            var fit = Fits.Fit(made, starts: 8, form: form);
            ended.Add(fit.Status);
            Assert.NotEqual(FitStatus.Stopped, fit.Status);
            if (fit.Status == FitStatus.Converged) Assert.True(fit.GradientNorm < 1e-9, $"seed {seed}: {fit.GradientNorm}");
            if (fit.Status is not (FitStatus.Converged or FitStatus.Boundary)) continue;
            var design = fit.Design;
            var search = new LocalSearch(fit.Likelihood, form, [.. design.PersonWeight], ColumnSurvey.Of(design, 1).Scale, CancellationToken.None);
            for (var l = 0.001; l < 20; l *= 1.4)
            {
                var from = new double[design.Layout.Count];
                from[^1] = l;
                var given = search.Run(from, [.. design.Layout.Free.Where(k => k < design.Layout.Coefficients)], new MinimisationSettings(Tolerance: 1e-5), []);
                Assert.True(
                    given.LogLikelihood <= fit.LogLikelihood + (fit.Status == FitStatus.Boundary ? 1e-2 : 1e-6),
                    $"seed {seed}: {given.LogLikelihood} at {l} above {fit.LogLikelihood} ({fit.Status})");
            }
        }

        Assert.Contains(FitStatus.Converged, ended);
    }
}
