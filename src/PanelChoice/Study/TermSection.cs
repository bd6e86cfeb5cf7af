using System.Collections.Immutable;

namespace PanelChoice.Study;

/// <summary>Reads one <c>[[term]]</c>: one source, at most one moment, and what is done to it afterwards.</summary>
internal static class TermSection
{
    private static readonly string[] ColumnOnly = ["is", "levels", "omit", .. StudyKeys.Moments, "transform"];

    /// <summary>Reads a term.</summary>
    /// <param name="table">The term's table.</param>
    /// <param name="hasNests">Whether the study has nests, without which <c>last_nest</c> means nothing.</param>
    /// <param name="problems">Where problems go.</param>
    public static TermSpecification Read(TableReader table, bool hasNests, StudyProblems problems)
    {
        var name = table.NeededText("name", "give each term a name of its own");
        var term = name is null ? "a term without a name" : $"the term '{name}'";
        var source = Source(table, term, hasNests, problems);
        var alternatives = table.Texts("alternatives");
        var each = table.Flag("each");
        var baseline = table.Text("base");
        var times = table.Text("times");
        var log = table.Word("transform", false, ("log", true));
        var scale = table.Number("scale", v => v != 0, "a finite number other than 0") ?? 1;
        var held = table.Number("fixed", _ => true, "a finite number");
        var start = table.Number("start", _ => true, "a finite number");

        if (table.Has("fixed") && table.Has("start"))
            problems.Add("study.excluded_key", table.PlaceOf("start"), $"{term} is both fixed and given a starting value", "keep one of 'fixed' and 'start'");
        CheckReach(table, term, source, alternatives, each, baseline, problems);
        return new TermSpecification(name ?? "", source, alternatives, each, baseline, times, log, scale, held, start, table.Place.Line);
    }

    private static TermSource Source(TableReader table, string term, bool hasNests, StudyProblems problems)
    {
        var column = table.Text("column");
        var constant = table.Flag("constant");
        var lastChoice = table.Whole("last_choice", 1);
        var lastNest = table.Whole("last_nest", 1);
        var stock = table.Number("stock", v => v is > 0 and < 1, "a retention between 0 and 1, both excluded");
        var pastShare = table.Flag("past_share");
        var firstChoice = table.Flag("first_choice");
        var moment = Moment(table, term, problems);
        var value = table.Text("is");
        var levels = table.Flag("levels");
        var omit = table.Text("omit");

        var stated = StudyKeys.Sources.Where(table.States).OrderBy(table.PlaceOf, InFile).ToList();
        if (stated.Count == 0)
            problems.Add("study.no_source", table.Place, $"{term} has no source", $"state one of {string.Join(", ", StudyKeys.Sources)}");
        else if (stated.Count > 1)
            problems.Add(
                "study.several_sources", table.PlaceOf(stated[1]), $"{term} has several sources: {string.Join(", ", stated)}", "keep one; write a term for each");
        else if (stated[0] != "column")
            foreach (var key in ColumnOnly.Where(table.States))
                problems.Add("study.needs_key", table.PlaceOf(key), $"'{key}' works on a 'column', and the source of {term} is '{stated[0]}'", $"remove '{key}' or name a column");
        else
            CheckLevels(table, term, problems);

        if (table.Has("last_nest") && !hasNests)
            problems.Add("study.needs_key", table.PlaceOf("last_nest"), $"{term} asks for the last nest, and the study has no nests", "write a [[nest]] or use last_choice");

        return stated.FirstOrDefault() switch
        {
            "constant" when constant => new ConstantSource(),
            "last_choice" => new LastChoiceSource(lastChoice ?? 1),
            "last_nest" => new LastNestSource(lastNest ?? 1),
            "stock" => new StockSource(stock ?? 0.5),
            "past_share" when pastShare => new PastShareSource(),
            "first_choice" when firstChoice => new FirstChoiceSource(),
            _ => new ColumnSource(column ?? "", moment, value, levels, omit),
        };
    }

    private static ColumnMoment Moment(TableReader table, string term, StudyProblems problems)
    {
        var lag = table.Whole("lag", 1);
        var lead = table.Whole("lead", 1);
        var change = table.Whole("change", 1);
        var mean = table.Flag("person_mean");
        var then = table.Whole("chosen_then", 1);
        var stated = StudyKeys.Moments.Where(table.States).OrderBy(table.PlaceOf, InFile).ToList();
        if (stated.Count > 1)
            problems.Add(
                "study.several_moments", table.PlaceOf(stated[1]), $"{term} reads its column at several moments: {string.Join(", ", stated)}", "keep one; write a term for each");
        return stated.FirstOrDefault() switch
        {
            "lag" => new Lag(lag ?? 1),
            "lead" => new Lead(lead ?? 1),
            "change" => new Change(change ?? 1),
            "person_mean" when mean => new PersonMean(),
            "chosen_then" => new ChosenThen(then ?? 1),
            _ => new Now(),
        };
    }

    private static void CheckLevels(TableReader table, string term, StudyProblems problems)
    {
        var levels = table.States("levels");
        if (levels && table.Has("is"))
            problems.Add("study.excluded_key", table.PlaceOf("is"), $"{term} has both 'is' and 'levels'", "keep 'is' for one value, 'levels' for all but one");
        if (levels && !table.Has("omit"))
            problems.Add("study.needs_key", table.PlaceOf("levels"), $"{term} has 'levels' without 'omit'", "write omit = the value that the others are compared with");
        if (!levels && table.Has("omit"))
            problems.Add("study.needs_key", table.PlaceOf("omit"), $"{term} has 'omit' without 'levels'", "write levels = true or remove 'omit'");
        if (table.Has("transform") && (levels || table.Has("is")))
            problems.Add(
                "study.excluded_key", table.PlaceOf("transform"), $"{term} turns text into indicators, which have no logarithm", "remove 'transform', or 'is' and 'levels'");
    }

    /// <summary>Which alternatives get a coefficient, and whether that can mean anything.</summary>
    private static void CheckReach(
        TableReader table, string term, TermSource source, ImmutableArray<string> alternatives, bool each, string? baseline, StudyProblems problems)
    {
        if (table.Has("base") && !each)
            problems.Add("study.needs_key", table.PlaceOf("base"), $"{term} has 'base' without 'each'", "write each = true or remove 'base'");
        if (each && baseline is not null && alternatives is [var only] && only == baseline)
            problems.Add("study.only_base", table.PlaceOf("base"), $"{term} enters its base alone, so that nothing is left to estimate", "name another base or more alternatives");
        if (source is not ConstantSource || table.Has("times") || table.Has("alternatives")) return;
        // Whether a column differs between alternatives, and whether 'alternatives' lists them all, only the data can tell.
        if (each && !table.Has("base"))
            problems.Add(
                "study.needs_key", table.PlaceOf("each"), $"{term} is the same for every alternative, so that 'each' needs a 'base' to compare with", "write base = the alternative without a constant");
        if (!each)
            problems.Add(
                "study.same_for_all", table.PlaceOf("constant"), $"{term} adds the same to every alternative and so changes no choice", "write each = true with a base, or name the alternatives");
    }

    private static readonly IComparer<Place> InFile =
        Comparer<Place>.Create((a, b) => (a.Line, a.Position).CompareTo((b.Line, b.Position)));
}
