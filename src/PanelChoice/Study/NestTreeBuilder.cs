using System.Collections.Immutable;

namespace PanelChoice.Study;

/// <summary>Builds the nest tree of a study over the alternatives of its panel.</summary>
public static class NestTreeBuilder
{
    /// <summary>
    /// Builds the tree: every nest after the nests it holds, the root last; alternatives and nests that no nest lists hang on the root.
    /// A nest that shares another's parameter points to the one that owns it, along any chain of <c>same_as</c>, and has its fixed value if it has one.
    /// </summary>
    /// <param name="study">A study as <see cref="StudyFileReader"/> gives it: no cycles, no member in two nests.</param>
    /// <param name="alternatives">The panel's alternatives, in the panel's order.</param>
    /// <returns>The tree, or a problem for each member that is neither an alternative nor a nest and each nest that is called like an alternative.</returns>
    public static Checked<NestTree> Build(StudySpecification study, ImmutableArray<string> alternatives)
    {
        ArgumentNullException.ThrowIfNull(study);
        var nests = study.Nests;
        var byName = nests.ToDictionary(n => n.Name);
        var problems = Problems(study, alternatives, byName);
        if (!problems.IsEmpty) return Checked<NestTree>.Bad(problems);

        var order = new List<NestSpecification>();
        foreach (var nest in nests) Place(nest);
        var numberOf = alternatives.Concat(order.Select(n => n.Name)).Select((name, i) => (name, i)).ToDictionary(x => x.name, x => x.i);
        var listed = nests.SelectMany(n => n.Members).ToHashSet();
        var nodes = ImmutableArray.CreateBuilder<NestNode>(order.Count + 1);
        foreach (var nest in order)
        {
            var owner = Owner(nest);
            nodes.Add(new NestNode(nest.Name, [.. nest.Members.Select(m => numberOf[m]).Order()], owner.Dissimilarity, order.IndexOf(owner)));
        }

        nodes.Add(new NestNode("", [.. numberOf.Where(n => !listed.Contains(n.Key)).Select(n => n.Value).Order()], 1, order.Count));
        return Checked<NestTree>.Good(new NestTree(alternatives, nodes.MoveToImmutable()));

        void Place(NestSpecification nest)
        {
            if (order.Contains(nest)) return;
            foreach (var member in nest.Members)
                if (byName.TryGetValue(member, out var inner)) Place(inner);
            order.Add(nest);
        }

        NestSpecification Owner(NestSpecification nest)
        {
            while (nest.SameAs is { } other) nest = byName[other];
            return nest;
        }
    }

    private static ImmutableArray<Problem> Problems(
        StudySpecification study, ImmutableArray<string> alternatives, Dictionary<string, NestSpecification> byName)
    {
        var problems = ImmutableArray.CreateBuilder<Problem>();
        foreach (var nest in study.Nests)
        {
            if (alternatives.Contains(nest.Name))
                Add("study.name_clash", nest, nest.Name, "a nest has the name of an alternative of the panel", "give the nest a name of its own");
            foreach (var member in nest.Members.Where(m => !alternatives.Contains(m) && !byName.ContainsKey(m)))
                Add(
                    "study.unknown_member", nest, member, $"the nest '{nest.Name}' lists a member that is neither an alternative of the panel nor a nest",
                    ClosestName.Remedy(member, [.. alternatives, .. byName.Keys.Where(k => k != nest.Name)]));
        }

        return problems.ToImmutable();

        void Add(string id, NestSpecification nest, string value, string what, string remedy) =>
            problems.Add(new Problem(id, study.File, what, remedy) { Line = nest.Line, Value = value });
    }
}
