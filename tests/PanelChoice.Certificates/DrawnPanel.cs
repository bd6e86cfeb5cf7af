using System.Collections.Immutable;
using MathNet.Numerics.Distributions;
using PanelChoice.Design;
using PanelChoice.Numerics;
using PanelChoice.Study;
using PanelChoice.Tests.Support;

namespace PanelChoice.Certificates;

/// <summary>
/// A simulated panel whose very kind is drawn too: 8 to 800 persons, 4 to 40 occasions, no nests, one, two, or one in another, dissimilarities from 0.15 to
/// 0.95, with and without habit, lasting tastes and sampling weights, clusters that are persons or households, both forms.
/// </summary>
/// <param name="Design">The design.</param>
/// <param name="Form">The form it is fitted in.</param>
/// <param name="Nests">What nests it has, in words.</param>
/// <param name="HasHabit">Whether the model has the last choice.</param>
/// <param name="IsWeighted">Whether persons have unequal weights.</param>
internal sealed record DrawnPanel(ChoiceDesign Design, NestedLogitForm Form, string Nests, bool HasHabit, bool IsWeighted)
{
    /// <summary>Panel number <paramref name="index"/>.</summary>
    public static DrawnPanel Of(long seed, int index)
    {
        var random = new CounterRandom(seed, "kind of panel", index);
        double Between(double low, double high) => low + ((high - low) * random.NextDouble());
        int LogBetween(double low, double high) => (int)Math.Round(low * Math.Pow(high / low, random.NextDouble()));

        var persons = LogBetween(8, 800);
        // At least 250 situations, so that most fits have a maximum, and at most 20,000.
        var occasions = Math.Clamp(LogBetween(4, 40), (250 / persons) + 1, Math.Max(4, 20_000 / persons));
        var (words, alternatives, nests) = random.Next(4) switch
        {
            0 => ("no nest", 4, ImmutableArray<NestSpecification>.Empty),
            1 => ("one nest", 4, [SyntheticPanel.Nest("one", "B", "C", "D")]),
            2 => ("two nests", 5, [SyntheticPanel.Nest("one", "A", "B"), SyntheticPanel.Nest("two", "C", "D")]),
            _ => ("a nest in a nest", 6, ImmutableArray.Create(SyntheticPanel.Nest("out", "A", "B", "in"), SyntheticPanel.Nest("in", "C", "D"))),
        };
        double[] dissimilarities = [.. nests.Select(_ => Between(0.15, 0.95))];
        if (words == "a nest in a nest") dissimilarities[1] *= dissimilarities[0];
        var habit = random.Next(3) == 0 ? (double?)null : Between(0.2, 2);
        var made = SyntheticPanel.Make(
            (int)(((seed * 1_000_003) + index) % int.MaxValue), persons, occasions, alternatives, nests, dissimilarities,
            attributes: 1 + random.Next(4), offeredShare: Between(0.6, 1), habit: habit, tasteSd: random.Next(3) * 0.6);
        var form = nests.IsEmpty || random.Next(3) > 0 ? NestedLogitForm.UtilityScaled : NestedLogitForm.Unscaled;
        var design = made.Design(form);
        var isWeighted = random.Next(3) == 0;
        var spread = Between(0.3, 1.5);
        if (isWeighted) design = design with { PersonWeight = [.. Enumerable.Range(0, persons).Select(_ => Math.Exp(spread * Normal.Sample(random, 0, 1)))] };
        if (random.Next(4) == 0 && persons >= 24) design = InHouseholds(design);
        return new DrawnPanel(design, form, words, habit is not null, isWeighted);
    }

    /// <summary>The design with three persons in a cluster, who do not stand side by side.</summary>
    private static ChoiceDesign InHouseholds(ChoiceDesign design)
    {
        var households = design.Persons / 3;
        return design with
        {
            ClusterBy = "household",
            ClusterOf = [.. Enumerable.Range(0, design.Persons).Select(p => p % households)],
            Clusters = [.. Enumerable.Range(0, households).Select(h => $"h{h}")],
        };
    }
}
