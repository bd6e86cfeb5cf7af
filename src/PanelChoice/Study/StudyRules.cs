using System.Collections.Immutable;

namespace PanelChoice.Study;

/// <summary>Rules that hold between tables of the study file.</summary>
internal static class StudyRules
{
    /// <summary>Notes a second grouping that is the first one again, or that goes by occasions where there are none.</summary>
    public static void CheckSecondCluster(InferenceSettings inference, PanelSource panel, TableReader table, StudyProblems problems)
    {
        if (SecondGrouping.Of(inference, panel) is not { } second) return;
        var isSame = second.Kind == SecondGroupingKind.Person ? inference.Cluster == "person" || inference.Cluster == panel.Person : second.Column == inference.Cluster;
        if (isSame)
            problems.Add(
                "study.same_column", table.PlaceOf("second_cluster"), "'second_cluster' names the clusters of 'cluster' again", "name another grouping, or remove the key",
                inference.SecondCluster!);
        if (second.Kind == SecondGroupingKind.Occasion && panel.Occasion is null)
            problems.Add(
                "study.needs_key", table.PlaceOf("second_cluster"), "'second_cluster' speaks of occasions, and [panel] names no 'occasion'",
                "name the column of the occasion or remove the key");
    }

    public static void Check(
        IReadOnlyList<(TermSpecification Term, TableReader Table)> terms, ImmutableArray<NestSpecification> nests,
        TableReader? panel, TableReader history, HistorySpecification rule, StudyProblems problems)
    {
        var named = terms.Where(t => t.Term.Name.Length > 0).ToList();
        foreach (var same in named.GroupBy(t => t.Term.Name))
            foreach (var (term, table) in same.Skip(1))
                problems.Add(
                    "study.duplicate_name", table.PlaceOf("name"), $"a term of this name already stands in line {same.First().Term.Line}", "give each term a name of its own", term.Name);

        foreach (var (term, table) in terms)
        {
            foreach (var nest in term.Alternatives.Where(a => nests.Any(n => n.Name == a)))
                problems.Add("study.name_clash", table.PlaceOf("alternatives"), $"the term '{term.Name}' names a nest where an alternative belongs", "name the alternatives that the nest holds", nest);
            if (term.Base is { } baseline && nests.Any(n => n.Name == baseline))
                problems.Add("study.name_clash", table.PlaceOf("base"), $"the base of the term '{term.Name}' is a nest", "name an alternative", baseline);
        }

        // One missing line is told once, at the first term that misses it.
        if (panel is not null && !panel.Has("occasion"))
        {
            if (terms.FirstOrDefault(t => LooksAround(t.Term)) is ({ } term, { } table))
                problems.Add(
                    "study.no_occasion", table.Place, $"the term '{term.Name}' looks at another occasion, and [panel] names no 'occasion'", "name the column of the occasion");
        }
        else if (rule.Previous is null && !history.Has("previous") && terms.FirstOrDefault(t => NeedsPrevious(t.Term)) is ({ } first, { } place))
            problems.Add(
                "study.no_previous", place.Place, $"the term '{first.Name}' looks back, and [history] does not say which occasion is the previous one",
                "write previous = \"recorded\", \"step\", \"day\", \"workday\" or \"week\" under [history]");
    }

    /// <summary>Whether a term asks for the occasion a given number of steps away, which is a matter of <c>previous</c>.</summary>
    internal static bool NeedsPrevious(TermSpecification term) => term.Source
        is LastChoiceSource or LastNestSource or ColumnSource { Moment: Lag or Lead or Change or ChosenThen };

    /// <summary>Whether a term asks for any other occasion.</summary>
    internal static bool LooksAround(TermSpecification term) =>
        NeedsPrevious(term) || term.Source is StockSource or PastShareSource or FirstChoiceSource;
}
