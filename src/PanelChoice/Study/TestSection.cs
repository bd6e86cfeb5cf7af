using System.Collections.Immutable;
using System.Globalization;

namespace PanelChoice.Study;

/// <summary>Reads the <c>[[test]]</c> tables and checks them against terms and nests, as far as that needs no data.</summary>
internal static class TestSection
{
    private const string Separator = ": ";

    /// <summary>Reads all tests.</summary>
    /// <param name="tables">Their tables.</param>
    /// <param name="terms">The study's terms.</param>
    /// <param name="nests">The study's nests.</param>
    /// <param name="problems">Where problems go.</param>
    public static ImmutableArray<TestSpecification> Read(
        IReadOnlyList<TableReader> tables, ImmutableArray<TermSpecification> terms, ImmutableArray<NestSpecification> nests, StudyProblems problems)
    {
        var tests = ImmutableArray.CreateBuilder<TestSpecification>();
        foreach (var table in tables)
        {
            var test = Read(table, terms, nests, problems);
            if (test.Name.Length > 0 && tests.FirstOrDefault(t => t.Name == test.Name) is { } other)
                problems.Add(
                    "study.duplicate_name", table.PlaceOf("name"), $"a test of this name already stands in line {other.Line}", "give each test a name of its own", test.Name);
            tests.Add(test);
        }

        return tests.ToImmutable();
    }

    /// <summary>A label in its two parts, where it is not a whole name by itself: "term: alternative".</summary>
    /// <param name="label">The label.</param>
    /// <param name="names">Names that may stand before the alternative; the longest that fits is taken.</param>
    internal static (string Name, string? Alternative) Split(string label, IEnumerable<string> names)
    {
        var known = names.Where(n => n.Length > 0).ToList();
        if (known.Contains(label)) return (label, null);
        var name = known.Where(n => label.StartsWith(n + Separator, StringComparison.Ordinal)).MaxBy(n => n.Length);
        return name is null ? (label, null) : (name, label[(name.Length + Separator.Length)..]);
    }

    private static TestSpecification Read(
        TableReader table, ImmutableArray<TermSpecification> terms, ImmutableArray<NestSpecification> nests, StudyProblems problems)
    {
        var name = table.NeededText("name", "give each test a name of its own");
        if (!table.Has("terms")) table.Missing("terms", "list what is tested: terms = [\"...\"], a term, \"term: alternative\", or a nest");
        var labels = table.PlacedTexts("terms");
        var values = table.Numbers("values");
        var equal = table.Flag("equal");
        var before = problems.Count;
        foreach (var (label, place) in labels) CheckLabel(label, place, terms, nests, problems);
        if (table.States("equal") && table.Has("values"))
            problems.Add(
                "study.excluded_key", table.PlaceOf("equal"), "a test has both 'values' and 'equal'", "keep 'values' to test against numbers, 'equal' to test against each other");
        else if (problems.Count == before)
            CheckNull(table, labels, values, equal, terms, nests, problems);
        return new TestSpecification(
            name ?? "", [.. labels.Select(l => new TestedTerm(l.Text, l.Place.Line, l.Place.Position))], [.. values.Select(v => v.Value)], equal, table.Place.Line);
    }

    private static void CheckLabel(string label, Place place, ImmutableArray<TermSpecification> terms, ImmutableArray<NestSpecification> nests, StudyProblems problems)
    {
        if (terms.All(t => t.Name != label) && nests.FirstOrDefault(n => n.Name == label) is { } nest)
        {
            if (nest.Dissimilarity is not null)
                problems.Add("study.test_fixed", place, "the dissimilarity of this nest is fixed, so that nothing is estimated that could be tested", "remove it from the test, or 'dissimilarity' from the nest", label);
            return;
        }

        var (name, alternative) = Split(label, terms.Select(t => t.Name));
        if (terms.FirstOrDefault(t => t.Name == name) is not { } term)
        {
            var head = name.Split(Separator)[0];
            var known = terms.Select(t => t.Name).Concat(nests.Select(n => n.Name)).Where(n => n.Length > 0).ToList();
            problems.Add(
                "study.unknown_term", place, "a test names a term or nest that does not exist",
                ClosestName.Of(label, known) is { } whole ? $"did you mean '{whole}'?"
                : head != label && ClosestName.Of(head, known) is { } close ? $"did you mean '{close}{label[head.Length..]}'?"
                : ClosestName.Remedy(label, known),
                label);
            return;
        }

        if (term.Fixed is not null)
            problems.Add("study.test_fixed", place, $"the coefficient of '{name}' is fixed, so that nothing is estimated that could be tested", "remove it from the test, or 'fixed' from the term", label);
        else if (alternative is null || term.Source is ColumnSource { Levels: true })
            return;
        else if (!term.Each)
            problems.Add("study.test_alternative", place, $"the term '{name}' has one coefficient for all its alternatives", $"write \"{name}\", or give the term each = true", label);
        else if (term.Base == alternative)
            problems.Add("study.test_alternative", place, $"'{alternative}' is the base of '{name}' and has no coefficient", "name another alternative", label);
        else if (!term.Alternatives.IsDefaultOrEmpty && !term.Alternatives.Contains(alternative))
            problems.Add("study.test_alternative", place, $"the term '{name}' does not enter '{alternative}'", ClosestName.Remedy(alternative, [.. term.Alternatives.Where(a => a != term.Base)]), label);
    }

    /// <summary>What is claimed of the terms; how many coefficients a term with <c>each</c> or <c>levels</c> has, only the data can tell.</summary>
    private static void CheckNull(
        TableReader table, ImmutableArray<(string Text, Place Place)> labels, ImmutableArray<(double Value, Place Place)> values, bool equal,
        ImmutableArray<TermSpecification> terms, ImmutableArray<NestSpecification> nests, StudyProblems problems)
    {
        bool IsNest(string label) => terms.All(t => t.Name != label) && nests.Any(n => n.Name == label);
        bool IsOne(string label) => IsNest(label)
            || terms.Any(t => t.Name == label && !t.Each && t.Source is not ColumnSource { Levels: true })
            || terms.Any(t => t.Source is not ColumnSource { Levels: true } && label.StartsWith(t.Name + Separator, StringComparison.Ordinal));

        var countable = !labels.IsEmpty && labels.All(l => IsOne(l.Text));
        if (equal && countable && labels.Length == 1)
            problems.Add("study.test_one", table.PlaceOf("terms"), "a test of equality names one coefficient", "name two or more, or remove 'equal'");
        if (equal && labels.Any(l => IsNest(l.Text)) && !labels.All(l => IsNest(l.Text)))
            problems.Add("study.test_mixed", table.PlaceOf("terms"), "a coefficient and the dissimilarity of a nest cannot be equal in any meaning", "write a test for each kind");
        if (!table.Has("values") || values.IsEmpty) return;
        if (countable && values.Length != labels.Length)
        {
            problems.Add(
                "study.test_values", table.PlaceOf("values"),
                string.Create(CultureInfo.InvariantCulture, $"a test of {labels.Length} coefficients has {values.Length} values"), "give one value for each, in their order");
            return;
        }

        for (var i = 0; countable && i < labels.Length; i++)
            if (IsNest(labels[i].Text) && values[i].Value <= 0)
                problems.Add(
                    "study.out_of_range", values[i].Place, "the dissimilarity of a nest can be tested against a number above 0 only", "change the value",
                    values[i].Value.ToString("R", CultureInfo.InvariantCulture));
    }
}
