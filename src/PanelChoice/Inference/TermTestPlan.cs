using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Covariates;
using PanelChoice.Design;
using PanelChoice.Estimation;
using PanelChoice.Study;

namespace PanelChoice.Inference;

/// <summary>Turns what a study says of tests into parameters of the likelihood; and the tests of habit that are made without being asked for.</summary>
internal static class TermTestPlan
{
    /// <summary>What is wrong with the study's tests that only the data can tell; empty when nothing is.</summary>
    /// <param name="study">The study.</param>
    /// <param name="covariates">One for each coefficient.</param>
    /// <param name="layout">The parameters.</param>
    public static ImmutableArray<Problem> Problems(StudySpecification study, ImmutableArray<Covariate> covariates, ParameterLayout layout)
    {
        var problems = ImmutableArray.CreateBuilder<Problem>();
        foreach (var test in study.Tests) Resolve(test, study, covariates, layout, problems);
        return problems.ToImmutable();
    }

    /// <summary>The tests: habit terms, all nests against plain logit, then the study's own.</summary>
    /// <param name="study">The study, without problems in its tests.</param>
    /// <param name="covariates">One for each coefficient.</param>
    /// <param name="layout">The parameters.</param>
    /// <param name="input">What is known of the fitted model.</param>
    /// <param name="settings">Whether single habit terms are tested by themselves.</param>
    public static ImmutableArray<TermTest> Of(
        StudySpecification study, ImmutableArray<Covariate> covariates, ParameterLayout layout, InferenceInput input, InferenceSettings settings)
    {
        var tests = ImmutableArray.CreateBuilder<TermTest>();
        ImmutableArray<int> habit = [.. layout.Free.Where(k => layout.Parameters[k].Role == CovariateRole.PastChoice)];
        if (habit.Length > 1) tests.Add(Build("all habit terms together", true, habit, [], false, layout, input));
        if (habit.Length == 1 || ScoreBootstrap.DrawsOf(input, settings) > 0)
            foreach (var k in habit) tests.Add(Build($"habit: {layout.Parameters[k].Label}", true, [k], [], false, layout, input));
        ImmutableArray<int> nests = [.. layout.Free.Where(k => layout.Parameters[k].Kind == ParameterKind.Dissimilarity)];
        if (!nests.IsEmpty) tests.Add(Build(nests.Length == 1 ? $"nest: {layout.Parameters[nests[0]].Label}" : "all nests at their limits", true, nests, [], false, layout, input));
        var none = ImmutableArray.CreateBuilder<Problem>();
        foreach (var test in study.Tests)
            tests.Add(Build(test.Name, false, Resolve(test, study, covariates, layout, none), test.Values, test.Equal, layout, input));
        return tests.ToImmutable();
    }

    private static ImmutableArray<int> Resolve(
        TestSpecification test, StudySpecification study, ImmutableArray<Covariate> covariates, ParameterLayout layout, ImmutableArray<Problem>.Builder problems)
    {
        var before = problems.Count;
        var tested = ImmutableArray.CreateBuilder<int>();
        foreach (var entry in test.Terms)
        {
            var parameters = ParametersOf(entry.Label, study, covariates, layout);
            if (parameters.IsEmpty)
            {
                ImmutableArray<string> labels = [.. covariates.Select(c => c.Alternative is null ? c.Term : $"{c.Term}: {c.Alternative}")];
                Add("study.unknown_term", entry, "the data give this term no such coefficient", ClosestName.Remedy(entry.Label, labels), entry.Label);
            }

            foreach (var k in parameters)
                if (!layout.Parameters[k].IsFree)
                    Add("study.test_fixed", entry, "this is not estimated, so that it cannot be tested", "remove it from the test", entry.Label);
                else if (tested.Contains(k))
                    Add("study.listed_twice", entry, $"the test '{test.Name}' names the parameter '{layout.Parameters[k].Label}' twice", "name it once", entry.Label);
                else
                    tested.Add(k);
        }

        if (problems.Count > before || test.Terms.IsEmpty) return tested.ToImmutable();
        if (test.Equal && tested.Count < 2)
            Add("study.test_one", test.Terms[0], "a test of equality finds one coefficient", "name two or more, or remove 'equal'", null);
        if (!test.Values.IsEmpty && test.Values.Length != tested.Count)
            Add(
                "study.test_values", test.Terms[0], string.Create(CultureInfo.InvariantCulture, $"the test '{test.Name}' is about {tested.Count} coefficients and has {test.Values.Length} values"),
                $"give one value for each of {string.Join(", ", tested.Select(k => layout.Parameters[k].Label))}", null);
        else if (tested.Zip(test.Values).Any(x => layout.Parameters[x.First].Kind == ParameterKind.Dissimilarity && x.Second <= 0))
            Add("study.out_of_range", test.Terms[0], "the dissimilarity of a nest can be tested against a number above 0 only", "change the value", null);
        return tested.ToImmutable();

        void Add(string id, TestedTerm at, string what, string remedy, string? value) =>
            problems.Add(new Problem(id, study.File, what, remedy) { Line = at.Line, Position = at.Position, Value = value });
    }

    private static ImmutableArray<int> ParametersOf(string label, StudySpecification study, ImmutableArray<Covariate> covariates, ParameterLayout layout)
    {
        ImmutableArray<int> Where(Func<Covariate, bool> fits) => [.. Enumerable.Range(0, covariates.Length).Where(k => fits(covariates[k]))];
        if (Where(c => study.Terms[c.TermIndex].Name == label) is { IsEmpty: false } whole) return whole;
        if (layout.Nests.FirstOrDefault(n => n.Name == label) is { } nest) return [nest.Parameter];
        // A term with 'levels' has a name for each text value, "term: value".
        if (Where(c => c.Term == label) is { IsEmpty: false } level) return level;
        var (name, alternative) = TestSection.Split(label, covariates.Select(c => c.Term).Concat(study.Terms.Select(t => t.Name)).Distinct());
        return Where(c => c.Alternative == alternative && (c.Term == name || study.Terms[c.TermIndex].Name == name));
    }

    private static TermTest Build(
        string name, bool isDefault, ImmutableArray<int> tested, ImmutableArray<double> values, bool equal, ParameterLayout layout, InferenceInput input)
    {
        var f = input.Free.Length;
        var rows = equal ? tested.Length - 1 : tested.Length;
        var matrix = new double[rows * f];
        var right = new double[rows];
        var against = new double[tested.Length];
        string? withheld = null;
        for (var i = 0; i < tested.Length; i++)
        {
            var place = input.Free.IndexOf(tested[i]);
            if (equal)
            {
                for (var r = 0; r < rows; r++)
                    if (i == 0) matrix[(r * f) + place] = -1;
                    else if (r == i - 1) matrix[(r * f) + place] = 1;
                continue;
            }

            var isNest = input.Kinds[tested[i]] == ParameterKind.Dissimilarity;
            matrix[(i * f) + place] = 1;
            if (!values.IsEmpty)
            {
                against[i] = values[i];
                right[i] = isNest ? Math.Log(values[i]) : values[i];
                continue;
            }

            var none = input.Nulls[place];
            withheld ??= none.Withheld;
            against[i] = none.Value;
            if (none.Parameter is { } parent) matrix[(i * f) + input.Free.IndexOf(parent)] = -1;
            else if (isNest) right[i] = Math.Log(none.Value);
        }

        return new TermTest(
            name, isDefault,
            [.. tested.Select(k => new TestedParameter(k, layout.Parameters[k].Name, layout.Parameters[k].Alternative, layout.Parameters[k].Kind))],
            equal ? null : [.. against])
        {
            Restriction = new LinearRestriction([.. matrix], [.. right]),
            Withheld = withheld,
        };
    }
}
