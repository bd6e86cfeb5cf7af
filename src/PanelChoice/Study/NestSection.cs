namespace PanelChoice.Study;

/// <summary>Reads the <c>[[nest]]</c> tables and checks what can be known without the panel's alternatives.</summary>
internal static class NestSection
{
    public static NestSpecification Read(TableReader table, StudyProblems problems)
    {
        var name = table.NeededText("name", "give each nest a name of its own");
        if (!table.Has("members")) table.Missing("members", "list the alternatives or nests it holds: members = [\"...\", \"...\"]");
        var members = table.Texts("members");
        var dissimilarity = table.Number("dissimilarity", v => v > 0, "a finite number above 0");
        var sameAs = table.Text("same_as");
        if (table.Has("dissimilarity") && table.Has("same_as"))
            problems.Add(
                "study.excluded_key", table.PlaceOf("same_as"), $"the nest '{name}' has both a dissimilarity of its own and that of another nest", "keep one of 'dissimilarity' and 'same_as'");
        return new NestSpecification(name ?? "", members, dissimilarity, sameAs, table.Place.Line);
    }

    /// <summary>Checks the nests against each other.</summary>
    /// <param name="nests">The nests with their tables.</param>
    /// <param name="problems">Where problems go.</param>
    public static void Check(IReadOnlyList<(NestSpecification Nest, TableReader Table)> nests, StudyProblems problems)
    {
        var named = nests.Where(n => n.Nest.Name.Length > 0).ToList();
        var byName = named.GroupBy(n => n.Nest.Name).ToDictionary(g => g.Key, g => g.First());
        foreach (var twice in named.GroupBy(n => n.Nest.Name).SelectMany(g => g.Skip(1)))
            problems.Add(
                "study.duplicate_name", twice.Table.PlaceOf("name"), $"a nest of this name already stands in line {byName[twice.Nest.Name].Nest.Line}", "give each nest a name of its own", twice.Nest.Name);

        var holder = new Dictionary<string, string>(StringComparer.Ordinal);
        foreach (var (nest, table) in nests)
            foreach (var member in nest.Members)
                if (!holder.TryAdd(member, nest.Name))
                    problems.Add(
                        "study.two_nests", table.PlaceOf("members"), $"'{member}' is a member of the nest '{holder[member]}' and of the nest '{nest.Name}'", "list it in one nest; a nest may be a member of another", member);

        // Only nests point onwards, so a chain of members or of same_as that comes back to its start is a cycle; each is told once.
        ReportCycles(
            byName, nest => nest.Members.Where(byName.ContainsKey), "study.nest_cycle", "members",
            chain => $"the nest '{chain[0]}' holds itself{(chain.Count > 1 ? $" by way of {Join(chain.Skip(1))}" : "")}", "list alternatives, or nests that do not hold this one", problems);
        foreach (var (nest, table) in named.Where(n => n.Nest.SameAs is { } other && !byName.ContainsKey(other)))
            problems.Add(
                "study.unknown_nest", table.PlaceOf("same_as"), $"the nest '{nest.Name}' shares the parameter of a nest that does not exist",
                ClosestName.Remedy(nest.SameAs!, [.. byName.Keys.Where(k => k != nest.Name)]), nest.SameAs);
        ReportCycles(
            byName, nest => nest.SameAs is { } other && byName.ContainsKey(other) ? [other] : [], "study.same_as_cycle", "same_as",
            chain => $"the nest '{chain[0]}' shares its own parameter{(chain.Count > 1 ? $" by way of {Join(chain.Skip(1))}" : "")}", "let one of them have a parameter of its own", problems);
    }

    private static void ReportCycles(
        Dictionary<string, (NestSpecification Nest, TableReader Table)> nests, Func<NestSpecification, IEnumerable<string>> onward,
        string id, string key, Func<List<string>, string> what, string remedy, StudyProblems problems)
    {
        var settled = new HashSet<string>(StringComparer.Ordinal);
        foreach (var start in nests.Keys) Follow(start, []);

        void Follow(string name, List<string> chain)
        {
            var at = chain.IndexOf(name);
            if (at >= 0)
            {
                var cycle = chain[at..];
                problems.Add(id, nests[cycle[0]].Table.PlaceOf(key), what(cycle), remedy);
                return;
            }

            if (!settled.Add(name)) return;
            foreach (var next in onward(nests[name].Nest)) Follow(next, [.. chain, name]);
        }
    }

    private static string Join(IEnumerable<string> names) => string.Join(", ", names.Select(n => $"'{n}'"));
}
