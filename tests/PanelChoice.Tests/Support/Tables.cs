using PanelChoice.Data;
using PanelChoice.Panels;
using PanelChoice.Study;
using Xunit;

namespace PanelChoice.Tests.Support;

/// <summary>Reads what must be readable, and compares tables and panels entry by entry.</summary>
internal static class Tables
{
    public static ChoiceTable Read(StudySpecification study)
    {
        var read = ChoiceTableReader.Read(study);
        Assert.True(read.Problems.IsEmpty, string.Join('\n', read.Problems.Select(p => p.Sentence)));
        return read.Value!;
    }

    public static ChoicePanel Panel(StudySpecification study)
    {
        var built = ChoicePanelBuilder.Build(study, Read(study));
        Assert.True(built.Problems.IsEmpty, string.Join('\n', built.Problems.Select(p => p.Sentence)));
        return built.Value!;
    }

    public static string[] Names(CodedColumn column) => [.. column.Codes.Select(c => c == CodedColumn.NoValue ? "(none)" : column.Levels[c])];

    /// <summary>Asserts that two tables hold the same, whatever file and rows they come from.</summary>
    public static void AssertSame(ChoiceTable expected, ChoiceTable actual)
    {
        Assert.Equal(Names(expected.Person), Names(actual.Person));
        Assert.Equal(expected.OccasionKind, actual.OccasionKind);
        Assert.Equal(expected.Occasion.AsEnumerable(), actual.Occasion.AsEnumerable());
        Assert.Equal(Names(expected.Alternative), Names(actual.Alternative));
        Assert.Equal(expected.Chosen.AsEnumerable(), actual.Chosen.AsEnumerable());
        Assert.Equal(expected.Offered.AsEnumerable(), actual.Offered.AsEnumerable());
        Assert.Equal(expected.Weight.AsEnumerable(), actual.Weight.AsEnumerable());
        Assert.Equal(expected.Numbers.Keys.Order(), actual.Numbers.Keys.Order());
        foreach (var (name, values) in expected.Numbers) Assert.Equal(values.AsEnumerable(), actual.Numbers[name].AsEnumerable());
        Assert.Equal(expected.Texts.Keys.Order(), actual.Texts.Keys.Order());
        foreach (var (name, values) in expected.Texts) Assert.Equal(Names(values), Names(actual.Texts[name]));
    }

    /// <summary>Asserts that two panels hold the same persons, occasions, choice sets and attributes, wherever their rows stand in the files.</summary>
    public static void AssertSame(ChoicePanel expected, ChoicePanel actual)
    {
        Assert.Equal(expected.Persons.AsEnumerable(), actual.Persons);
        Assert.Equal(expected.Alternatives.AsEnumerable(), actual.Alternatives);
        Assert.Equal(expected.PersonStart.AsEnumerable(), actual.PersonStart.AsEnumerable());
        Assert.Equal(expected.PersonOf.AsEnumerable(), actual.PersonOf.AsEnumerable());
        Assert.Equal(expected.Occasion.AsEnumerable(), actual.Occasion.AsEnumerable());
        Assert.Equal(expected.Offered.AsEnumerable(), actual.Offered.AsEnumerable());
        Assert.Equal(expected.Chosen.AsEnumerable(), actual.Chosen.AsEnumerable());
        Assert.Equal(expected.Weight.AsEnumerable(), actual.Weight.AsEnumerable());
        Assert.Equal(expected.Clusters.AsEnumerable(), actual.Clusters);
        Assert.Equal(expected.ClusterOf.AsEnumerable(), actual.ClusterOf.AsEnumerable());
        Assert.Equal(expected.Row.Select(r => r < 0), actual.Row.Select(r => r < 0));
        foreach (var name in expected.Table.Numbers.Keys)
            Assert.Equal(
                expected.Row.Where(r => r >= 0).Select(r => expected.Table.Numbers[name][r]),
                actual.Row.Where(r => r >= 0).Select(r => actual.Table.Numbers[name][r]));
    }
}
