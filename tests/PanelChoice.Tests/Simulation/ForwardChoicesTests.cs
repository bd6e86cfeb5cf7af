using PanelChoice.Likelihood;
using PanelChoice.Numerics;
using PanelChoice.Simulation;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Simulation;

public class ForwardChoicesTests
{
    private static TreeProbabilities Space()
    {
        var tree = SyntheticPanel.TreeOf(["A", "B", "C", "D"], [SyntheticPanel.Nest("pair", "A", "B")]);
        var space = new TreeProbabilities(tree, NestedLogitForm.UtilityScaled);
        space.SetDissimilarities([0.4, 1]);
        return space;
    }

    [Fact]
    public void A_draw_falls_into_the_stretch_of_its_alternative()
    {
        var space = Space();
        space.Compute([0.2, -0.1, 0.3, 0], [true, true, false, true]);
        var (a, b) = (space.Probability[0], space.Probability[1]);
        Assert.Equal(0, ForwardChoices.Draw(space, 1e-12));
        Assert.Equal(0, ForwardChoices.Draw(space, a - 1e-12));
        Assert.Equal(1, ForwardChoices.Draw(space, a + 1e-12));
        Assert.Equal(1, ForwardChoices.Draw(space, a + b - 1e-12));
        Assert.Equal(3, ForwardChoices.Draw(space, a + b + 1e-12));
        Assert.Equal(3, ForwardChoices.Draw(space, 1));
    }

    [Fact]
    public void Frequencies_follow_the_nested_logit()
    {
        var space = Space();
        const int Draws = 20000;
        double[] utility = [0.2, -0.1, 0.3, 0];
        var chosen = ForwardChoices.Simulate(space, Draws, new CounterRandom(3, "frequencies", 0), (_, _, v, offered) =>
        {
            utility.CopyTo(v);
            offered.Fill(true);
        });
        // Pearson's statistic has 3 degrees of freedom: its 99.9 percent point is 16.27.
        var statistic = Enumerable.Range(0, 4).Sum(j => Math.Pow(chosen.Count(c => c == j) - (Draws * space.Probability[j]), 2) / (Draws * space.Probability[j]));
        Assert.InRange(statistic, 0, 16.27);
    }

    [Fact]
    public void Lags_are_fed_by_the_choices_simulated_before()
    {
        // Whoever chose an alternative last time takes the next one in the row now: only simulated choices can produce the round.
        var chosen = ForwardChoices.Simulate(Space(), 9, new CounterRandom(3, "round", 0), (t, before, v, offered) =>
        {
            Assert.Equal(t, before.Length);
            offered.Fill(true);
            v.Clear();
            v[t == 0 ? 2 : (before[^1] + 1) % 4] = 200;
        });
        Assert.Equal([2, 3, 0, 1, 2, 3, 0, 1, 2], chosen);
    }
}
