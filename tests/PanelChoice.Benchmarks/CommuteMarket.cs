using System.Collections.Immutable;
using PanelChoice.Study;

namespace PanelChoice.Benchmarks;

/// <summary>The alternatives of a synthetic commute panel in the library's order, and which of them a term is about.</summary>
/// <param name="Tree">Two nests of two under the root, beside alternatives that stand alone.</param>
/// <param name="Nests">The nests as a study names them.</param>
/// <param name="Base">The alternative without a constant.</param>
/// <param name="OfferedShare">Share of the persons to whom each alternative is offered.</param>
/// <param name="Waiting">Alternatives that are waited for.</param>
/// <param name="Single">The alternative of each single term.</param>
internal sealed record CommuteMarket(
    NestTree Tree, ImmutableArray<NestSpecification> Nests, int Base, ImmutableArray<double> OfferedShare, ImmutableArray<int> Waiting,
    ImmutableArray<int> Single)
{
    /// <summary>Name of the alternative without a constant.</summary>
    public const string BaseName = "car";

    /// <summary>The market of a shape.</summary>
    public static CommuteMarket Of(CommuteShape shape)
    {
        ImmutableArray<string> names = shape.Alternatives == 6
            ? ["bike", "bus", "car", "ferry", "rail", "walk"]
            : ["bike", "bus", "car", "rail", "walk"];
        ImmutableArray<NestSpecification> nests =
            [new("private", ["bike", "car"], null, null, 0), new("public", ["bus", "rail"], null, null, 0)];
        int[] At(params string[] wanted) => [.. wanted.Select(w => names.IndexOf(w))];
        int[] alone = [.. Enumerable.Range(0, names.Length).Where(j => !nests.Any(n => n.Members.Contains(names[j])))];
        var tree = new NestTree(
            names,
            [
                new("private", [.. At("bike", "car")], null, 0), new("public", [.. At("bus", "rail")], null, 1),
                new("", [.. alone, names.Length, names.Length + 1], 1, 2),
            ]);
        return new CommuteMarket(
            tree, nests, names.IndexOf(BaseName),
            [.. names.Select(n => n switch { "car" => 0.85, "rail" => 0.80, "bike" => 0.90, _ => 1.0 })],
            [.. At("bus", "rail")], [.. At("car", "rail", "bike").Take(shape.Singles)]);
    }
}
