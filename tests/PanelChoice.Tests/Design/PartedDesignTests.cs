using System.Collections.Immutable;
using System.Globalization;
using PanelChoice.Covariates;
using PanelChoice.Data;
using PanelChoice.Design;
using PanelChoice.Diagnostics;
using PanelChoice.Numerics;
using PanelChoice.Panels;
using PanelChoice.Study;
using PanelChoice.Tests.Support;
using Xunit;

namespace PanelChoice.Tests.Design;

/// <summary>A panel read in parts of whole persons gives the sample and the design of one that is held in memory, bit for bit, wherever the parts end.</summary>
public class PartedDesignTests
{
    private const string Alphabet = "ABCD";

    public static TheoryData<string, string> Rules => new()
    {
        { "recorded", "drop" }, { "recorded", "zero" }, { "step", "drop" }, { "day", "drop" }, { "workday", "drop" }, { "workday", "zero" }, { "week", "zero" },
    };

    [Theory]
    [MemberData(nameof(Rules))]
    public void Parts_of_any_size_give_the_bits_of_the_whole(string rule, string without)
    {
        using var folder = new TemporaryFolder();
        var study = Write(folder, rule, without, "");
        var whole = Whole(study);
        foreach (var rows in new[] { 1, 37, 400, int.MaxValue })
        {
            using var parts = Good(PanelAnalysisSample.Read(study, 0, rows, WorkContext.Quiet));
            Same(whole.Sample, parts.Sample);
            Same(whole.Design, parts.Design);
            Same(whole.Static!.Design, parts.Static()!.Design);
            Assert.Equal(whole.Static.Means.AsEnumerable(), parts.Static()!.Means);
        }
    }

    [Theory]
    [MemberData(nameof(Rules))]
    public void The_static_design_derived_from_the_main_one_has_the_bits_of_the_one_built_from_the_data(string rule, string without)
    {
        using var folder = new TemporaryFolder();
        var written = Write(folder, rule, without, "");
        var cost = written.Terms.Single(t => t.Name == "minutes") with
        {
            Name = "cost by mode", Source = new ColumnSource("cost", new Now(), null, false, null), Each = true, Base = "A",
        };
        // Means of indicators of a text column have names that only the data tell.
        var study = written with { Terms = [.. written.Terms.Where(t => t.Name != "weather"), cost] };
        var whole = Whole(study);
        Assert.Equal(3, whole.Static!.Means.Length);
        var asksTheData = false;
        var derived = StaticDesign.Of(
            study, whole.Sample, whole.Design,
            _ =>
            {
                asksTheData = true;
                return whole.Static.Design;
            },
            format => new MemoryBlockStore(format))!;
        Assert.Equal(rule == "workday", asksTheData);
        Same(whole.Static.Design, derived.Design);
        Assert.Equal(whole.Static.Means.AsEnumerable(), derived.Means);

        asksTheData = false;
        var lagged = study with { Terms = [.. study.Terms.Where(t => t.Name != "minutes")] };
        var other = Whole(lagged);
        StaticDesign.Of(
            lagged, other.Sample, other.Design,
            _ =>
            {
                asksTheData = true;
                return other.Static!.Design;
            },
            format => new MemoryBlockStore(format));
        Assert.True(asksTheData, "the mean of a column that enters with a lag alone is not in the main design");
    }

    [Fact]
    public void Rows_inside_a_person_may_stand_in_any_order()
    {
        using var folder = new TemporaryFolder();
        var study = Write(folder, "recorded", "drop", "");
        var whole = Whole(study);
        var lines = File.ReadAllLines(study.Panel.FullPath);
        var mixed = lines.Skip(1).GroupBy(l => l.Split(',')[0]).SelectMany(p => p.OrderBy(l => string.GetHashCode(l, StringComparison.Ordinal)));
        File.WriteAllLines(study.Panel.FullPath, [lines[0], .. mixed]);
        using var parts = Good(PanelAnalysisSample.Read(study, 0, 50, WorkContext.Quiet));
        Same(whole.Design, parts.Design);
    }

    [Fact]
    public void Persons_in_another_order_are_held_as_a_whole_where_there_is_no_place_to_sort_them()
    {
        using var folder = new TemporaryFolder();
        var study = Write(folder, "recorded", "drop", "");
        var whole = Whole(study);
        var lines = File.ReadAllLines(study.Panel.FullPath);
        File.WriteAllLines(study.Panel.FullPath, [.. lines[..1], .. lines[2..], lines[1]]);
        using var held = Good(PanelAnalysisSample.Read(study, 0, 50, WorkContext.Quiet));
        Same(whole.Design, held.Design);
    }

    [Fact]
    public void Problems_are_those_of_the_whole()
    {
        using var folder = new TemporaryFolder();
        var study = Write(folder, "recorded", "drop", "");
        var good = File.ReadAllLines(study.Panel.FullPath);
        void Check(Func<string[], int, string> change)
        {
            File.WriteAllLines(study.Panel.FullPath, [good[0], .. good.Skip(1).Select((l, i) => string.Join(',', change(l.Split(','), i)))]);
            var whole = PanelAnalysis.Prepare(study, WorkContext.Quiet).Problems.Select(p => p.Sentence).ToList();
            Assert.NotEmpty(whole);
            Assert.Equal(whole, PanelAnalysisSample.Read(study, 0, 40, WorkContext.Quiet).Problems.Select(p => p.Sentence));
        }

        string Join(string[] cells, int column, string value) => string.Join(',', cells.Select((c, i) => i == column ? value : c));
        Check((cells, i) => i % 3 == 0 ? Join(cells, 5, "many") : Join(cells, 5, cells[5]));
        Check((cells, i) => i % 50 == 7 ? Join(cells, 4, "0") : Join(cells, 4, cells[4]));
        Check((cells, i) => i % 40 == 5 ? Join(cells, 7, "0") : Join(cells, 7, cells[7]));
        Check((cells, _) => Join(cells, 6, "fine"));
    }

    [Fact]
    public void Codings_do_not_depend_on_the_parts_in_which_values_come()
    {
        double[] values = [0, 1.25, -3.5, 12_345.75, 0.1, 7, 40_000, -0.125];
        for (var cut = 0; cut <= values.Length; cut++)
        {
            var survey = new CodingSurvey(1);
            survey.Add(Column(values[..cut]));
            survey.Add(Column(values[cut..]));
            Assert.Equal(new StoredColumn(ColumnCoding.Whole32, 3), Assert.Single(survey.Codings()));
        }

        Assert.Equal(new StoredColumn(ColumnCoding.Whole16, 0), Assert.Single(Of([5, -32_767])));
        Assert.Equal(new StoredColumn(ColumnCoding.Whole32, 0), Assert.Single(Of([5, 32_768])));
        Assert.Equal(new StoredColumn(ColumnCoding.AsIs, 0), Assert.Single(Of([1.0 / 3])));
        // One decimal more than a whole number of 32 bits can hold.
        Assert.Equal(new StoredColumn(ColumnCoding.AsIs, 0), Assert.Single(Of([400_000_000, 0.5])));
        // Where no decimals fit both alternatives, whole numbers are still held as such.
        var both = new CodingSurvey(2);
        both.Add(Column([1, 1.0 / 3, 2, 0.25]) with { Enters = [0, 1] });
        Assert.Equal([new StoredColumn(ColumnCoding.Whole16, 0), new StoredColumn(ColumnCoding.AsIs, 0)], both.Codings().ToArray());

        static ImmutableArray<StoredColumn> Of(double[] all)
        {
            var survey = new CodingSurvey(1);
            survey.Add(Column(all));
            return survey.Codings();
        }

        static Covariate Column(double[] all) => new("x", null, [0], [.. all], false, CovariateRole.Present, null, null, 0);
    }

    /// <summary>60 persons with gaps, week-ends, one-alternative days, weights and households; a level that leaves the sample with its only day.</summary>
    internal static StudySpecification Write(TemporaryFolder folder, string rule, string without, string more)
    {
        var isDate = rule is not ("step" or "recorded");
        var random = new CounterRandom(5, "parts", 0);
        var lines = new List<string> { "who,when,mode,running,taken,minutes,weather,cost,house,weight" };
        for (var p = 1; p <= 60; p++)
        {
            var days = p == 7 ? 1 : 3 + random.Next(14);
            var day = random.Next(3);
            for (var d = 0; d < days; d++, day += random.Next(6) == 0 ? 3 : 1)
            {
                var offered = Alphabet.Select(_ => random.Next(7) > 0).ToArray();
                var chosen = random.Next(4);
                offered[chosen] = true;
                if (random.Next(12) == 0) offered = [.. Alphabet.Select((_, j) => j == chosen)];
                var weather = p == 7 ? "storm" : random.Next(3) == 0 ? "wet" : "fine";
                var when = isDate ? new DateOnly(2031, 3, 3).AddDays(day).ToString("yyyy-MM-dd", CultureInfo.InvariantCulture) : $"{day}";
                for (var j = 0; j < 4; j++)
                    lines.Add(string.Create(
                        CultureInfo.InvariantCulture,
                        $"{p},{when},{Alphabet[j]},{(offered[j] ? 1 : 0)},{(j == chosen ? 1 : 0)},{random.NextDouble() * 30:0.0},{weather},{1 + (random.NextDouble() * 5):R},{p / 3},{1 + (p / 3 % 4)}"));
            }
        }

        folder.Write("panel.csv", string.Join('\n', lines) + "\n");
        var file = folder.Write("study.toml", $"""
            title = "Parts"
            [panel]
            file = "panel.csv"
            person = "who"
            occasion = "when"
            alternative = "mode"
            chosen = "taken"
            offered = "running"
            weight = "weight"
            shared_calendar = true
            [history]
            previous = "{rule}"
            without_history = "{without}"
            [[nest]]
            name = "wet"
            members = ["C", "D"]
            [[term]]
            name = "constant"
            constant = true
            each = true
            base = "A"
            [[term]]
            name = "minutes"
            column = "minutes"
            [[term]]
            name = "log cost"
            column = "cost"
            transform = "log"
            alternatives = ["B", "D"]
            [[term]]
            name = "last minutes"
            column = "minutes"
            lag = 1
            [[term]]
            name = "weather"
            column = "weather"
            levels = true
            omit = "fine"
            each = true
            base = "A"
            [[term]]
            name = "same again"
            last_choice = 1
            [[term]]
            name = "stock"
            stock = 0.7
            [inference]
            cluster = "house"
            {more}
            """);
        return Good(StudyFileReader.Read(file));
    }

    internal static void Same(EstimationSample expected, EstimationSample actual)
    {
        Assert.Equal((expected.Rows, expected.RecordedPersons, expected.RecordedOccasions), (actual.Rows, actual.RecordedPersons, actual.RecordedOccasions));
        Assert.Equal((expected.Persons, expected.Occasions, expected.IsWeighted), (actual.Persons, actual.Occasions, actual.IsWeighted));
        Assert.Equal(expected.Sha256, actual.Sha256);
        Assert.Equal(expected.Alternatives.AsEnumerable(), actual.Alternatives);
        Assert.Equal(expected.LeftOut.AsEnumerable(), actual.LeftOut);
        Assert.Equal(expected.StockStarts.AsEnumerable(), actual.StockStarts);
        Assert.Equal(expected.Cautions.AsEnumerable(), actual.Cautions);
        Assert.Equal(expected.Covariates.Select(c => (c.Label, c.TermIndex, c.Role)), actual.Covariates.Select(c => (c.Label, c.TermIndex, c.Role)));
        Assert.Equal((expected.Times.AreWorkdays, expected.Times.AreMostlyApart), (actual.Times.AreWorkdays, actual.Times.AreMostlyApart));
        for (var t = 0; t < expected.Occasions; t++)
            Assert.Equal((expected.Times.Occasion[t], expected.Times.Record[t]), (actual.Times.Occasion[t], actual.Times.Record[t]));
    }

    internal static void Same(ChoiceDesign expected, ChoiceDesign actual)
    {
        Assert.Equal(expected.Layout.Parameters.AsEnumerable(), actual.Layout.Parameters);
        Assert.Equal(expected.Layout.Nests.AsEnumerable(), actual.Layout.Nests);
        Assert.Equal(expected.Layout.NodeParameter.AsEnumerable(), actual.Layout.NodeParameter);
        Assert.Equal(expected.Columns.AsEnumerable(), actual.Columns);
        Assert.Equal(expected.Store.Format.Columns.AsEnumerable(), actual.Store.Format.Columns);
        Assert.Equal(expected.Blocks.AsEnumerable(), actual.Blocks);
        Assert.Equal(expected.PersonStart.AsEnumerable(), actual.PersonStart);
        Assert.Equal(expected.PersonWeight.AsEnumerable(), actual.PersonWeight);
        Assert.Equal(expected.ClusterOf.AsEnumerable(), actual.ClusterOf);
        Assert.Equal(expected.Clusters.AsEnumerable(), actual.Clusters);
        var (one, other) = (expected.Store.Reader(), actual.Store.Reader());
        foreach (var (a, b) in expected.Blocks.Zip(actual.Blocks))
        {
            one.Open(a);
            other.Open(b);
            Assert.Equal(one.OfferedMasks.ToArray(), other.OfferedMasks.ToArray());
            Assert.Equal(one.ChosenMasks.ToArray(), other.ChosenMasks.ToArray());
            for (var c = 0; c < expected.Store.Format.Columns.Length; c++)
                for (var lane = 0; lane < a.Lanes; lane++)
                    Assert.Equal(BitConverter.DoubleToInt64Bits(one.Value(c, lane)), BitConverter.DoubleToInt64Bits(other.Value(c, lane)));
        }
    }

    internal static T Good<T>(Checked<T> read)
        where T : class
    {
        Assert.Empty(read.Problems.Select(p => p.Sentence));
        return read.Value!;
    }

    /// <summary>The stages on tables in memory.</summary>
    private static (EstimationSample Sample, ChoiceDesign Design, StaticDesign? Static) Whole(StudySpecification study)
    {
        var panel = Good(ChoicePanelBuilder.Build(study, Good(ChoiceTableReader.Read(study))));
        var tree = Good(NestTreeBuilder.Build(study, panel.Alternatives));
        var covariates = Good(CovariateBuilder.Build(study, panel, tree));
        var sample = EstimationSample.Of(covariates);
        var design = Design(covariates);
        return (sample, design, StaticDesign.Of(study, sample, design, terms => Design(Good(CovariateBuilder.BuildOn(study, panel, tree, terms, covariates.Used)))));

        ChoiceDesign Design(CovariateSet set) => ChoiceDesignBuilder.Build(set, tree, study.Nests, study.Estimate.Form);
    }
}
